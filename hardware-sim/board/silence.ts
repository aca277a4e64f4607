import { type Beat, FAULT, REASON, WIRE_TIMES } from '../../server/wire/messages.js';
import type { OutputBank } from './outputBank.js';
import type { Voice } from './voice.js';

/** How long the host has been silent under this tag, and what the board does about it. */
export class Silence {
  /** A fresh beat has come under this tag: nothing is acted on before. */
  beaten = false;
  /** When silence began to be reckoned: at identify, then the newest finished stamp. */
  #heardUs = 0;
  #newestFinishedUs = Number.NEGATIVE_INFINITY;
  #slotsEnded = false;
  readonly #voice: Voice;
  readonly #bank: OutputBank;

  constructor(voice: Voice, bank: OutputBank) {
    this.#voice = voice;
    this.#bank = bank;
  }

  /** A tag begins now. */
  begin(): void {
    this.beaten = false;
    this.#heardUs = this.#voice.nowUs;
    this.#newestFinishedUs = Number.NEGATIVE_INFINITY;
    this.#slotsEnded = false;
  }

  /** True while no slot may be armed. */
  get forSlots(): boolean {
    return !this.beaten || this.#us() >= WIRE_TIMES.slotSilenceUs;
  }

  beat({ finishedUs, wanted }: Beat): void {
    const { nowUs } = this.#voice;
    const ageUs = (nowUs - finishedUs) | 0;
    // A stamp ahead of the board's own time is nobody's finished work.
    if (ageUs < 0) return;
    const finished = nowUs - ageUs;
    if (finished < this.#newestFinishedUs) return;
    this.#newestFinishedUs = finished;
    if (finished > this.#heardUs) this.#heardUs = finished;
    if (ageUs < WIRE_TIMES.slotSilenceUs) {
      this.beaten = true;
      this.#slotsEnded = false;
    }
    this.#bank.endSlots(REASON.unwanted, (slot) => (wanted & (1 << slot)) === 0);
  }

  /** A thousand times a second while there is a tag. */
  watch(): void {
    const silentUs = this.#us();
    if (silentUs < WIRE_TIMES.slotSilenceUs) return;
    const voice = this.#voice;
    if (!this.#slotsEnded) {
      this.#slotsEnded = true;
      this.#bank.endSlots(REASON.silence, () => true);
      voice.fault(FAULT.watchdogSlots, silentUs);
    }
    if (silentUs < WIRE_TIMES.outputSilenceUs) return;
    this.#bank.endForSilence(REASON.silence);
    // The last word under the tag; what follows goes out under tag 0.
    voice.fault(FAULT.watchdogOutputs, silentUs);
    voice.previousTag = voice.tag;
    voice.tag = 0;
  }

  #us(): number {
    return this.#voice.nowUs - this.#heardUs;
  }
}
