import type { AlarmView } from '../../server/loop/alarms/alarms.js';

/** Tones of each level, Hz: told apart by number and direction, and not by pitch alone. */
const TONES: Readonly<Record<AlarmView['level'], readonly number[]>> = {
  bad: [880, 660, 880, 660],
  warn: [660, 660],
  note: [520],
};
const TONE_S = 0.16;
const GAP_S = 0.07;

/** Plays short tones; a browser lets a page sound only after a key or a click. */
export class Speaker {
  private context: AudioContext | undefined;

  /** Whether the browser still waits for a key or a click on the page. */
  get blocked(): boolean {
    return this.context !== undefined && this.context.state !== 'running';
  }

  /** Within a key or a click, or else it stays blocked until one. */
  async wake(): Promise<void> {
    this.context ??= new AudioContext();
    if (this.context.state !== 'running') await this.context.resume().catch(() => undefined);
  }

  play(level: AlarmView['level'], volume: number): void {
    const { context } = this;
    if (context?.state !== 'running' || volume <= 0) return;
    TONES[level].forEach((hz, n) => {
      const at = context.currentTime + n * (TONE_S + GAP_S);
      const tone = new OscillatorNode(context, { type: 'triangle', frequency: hz });
      const loud = new GainNode(context, { gain: 0 });
      // Faded in and out: a hard edge clicks.
      loud.gain.setValueAtTime(0, at);
      loud.gain.linearRampToValueAtTime(volume, at + 0.015);
      loud.gain.setValueAtTime(volume, at + TONE_S - 0.03);
      loud.gain.linearRampToValueAtTime(0, at + TONE_S);
      tone.connect(loud).connect(context.destination);
      tone.start(at);
      tone.stop(at + TONE_S);
    });
  }
}
