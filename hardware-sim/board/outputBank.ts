import { OUTCOME, PULSE_FLAG, REASON } from '../../server/wire/messages.js';
import type { BoardSetting } from './boardSetting.js';
import { OutputLine, type Shape } from './outputLine.js';
import { SlotTable, slotAhead } from './slots.js';
import type { Voice } from './voice.js';
import { WaitingPulses } from './waitingPulses.js';

export const ALL_OUTPUTS = 0xffff;

/** Every output with what is on its way to it: waiting pulses and armed slots. Tells the outcomes. */
export class OutputBank {
  readonly lines: readonly OutputLine[];
  readonly slots: SlotTable;
  readonly waiting: WaitingPulses;
  probe: (output: number, on: boolean, boardUs: number) => void = () => {};
  /** Board time of the next change that an output or a waiting pulse makes by itself. */
  nextUs = Number.POSITIVE_INFINITY;
  readonly #voice: Voice;

  constructor(setting: BoardSetting, voice: Voice) {
    this.#voice = voice;
    this.lines = Array.from({ length: setting.outputs }, () => new OutputLine());
    this.slots = new SlotTable(setting.slots);
    this.waiting = new WaitingPulses(setting.waiting);
  }

  /** What is due now: falls first, so that one pulse may follow another without a gap. */
  runDue(): void {
    const { nowUs } = this.#voice;
    for (let n = 0; n < this.lines.length; n++) {
      const line = this.lines[n]!;
      if (line.on && line.nextUs <= nowUs) this.#fall(n, line);
    }
    for (let n = 0; n < this.lines.length; n++) {
      const line = this.lines[n]!;
      if (line.on || line.nextUs > nowUs) continue;
      const reason = line.riseAgain(nowUs);
      if (reason === REASON.none) this.#rose(n, line);
      else this.#done(n, line, reason);
    }
    for (;;) {
      const due = this.waiting.takeDue(nowUs);
      if (due === undefined) break;
      this.rise(due.id, due.output, due, due.flags, due.countFrom, due.countTo);
    }
    this.schedule();
  }

  /** The count has just come to the nearest target in this direction. */
  reached(rising: boolean): void {
    const { count } = this.#voice;
    for (const slot of this.slots.slots) {
      if (!slot.armed || slot.rising !== rising || slot.target !== count) continue;
      slot.armed = false;
      this.rise(slot.id, slot.output, slot, 0, 0, 0);
    }
    this.slots.refresh(count);
    this.schedule();
  }

  /** Ends the slots that the count has left behind. */
  sweep(): void {
    const { count } = this.#voice;
    for (const slot of this.slots.slots) {
      if (!slot.armed || slotAhead(slot, count) > 0) continue;
      slot.armed = false;
      this.#voice.outcome(slot.id, OUTCOME.passed, REASON.none, slot.output, 0);
    }
    this.slots.refresh(count);
  }

  /** The first rise of a command, or the reason why not. */
  rise(
    id: number,
    output: number,
    shape: Shape,
    flags: number,
    countFrom: number,
    countTo: number,
  ): void {
    const { nowUs, count } = this.#voice;
    const line = this.lines[output]!;
    const outside =
      (flags & PULSE_FLAG.countWindow) !== 0 &&
      (((count - countFrom) | 0) < 0 || ((countTo - count) | 0) < 0);
    const reason = outside ? REASON.countWindow : line.riseReason(shape, nowUs, count);
    if (reason !== REASON.none) {
      this.#voice.outcome(id, OUTCOME.refused, reason, output, 0);
      return;
    }
    line.begin(id, shape, nowUs, count);
    this.#rose(output, line);
    this.#voice.outcome(id, OUTCOME.fired, REASON.none, output, 0);
  }

  /** Ends whatever owns the output, now. */
  stop(output: number, reason: number): void {
    const line = this.lines[output]!;
    const command = line.owner === 'command';
    if (command) line.end(reason);
    if (line.on) this.#fall(output, line);
    else if (command) this.#done(output, line, reason);
    if (line.owner === 'sync') line.release();
    this.schedule();
  }

  /** Ends everything on the outputs in `mask`, sync trains too. */
  endAll(mask: number, reason: number): void {
    this.#endUnrisen(mask, reason);
    for (let n = 0; n < this.lines.length; n++) {
      if ((mask & (1 << n)) !== 0 && this.lines[n]!.owner !== 'none') this.stop(n, reason);
    }
  }

  /** Ends what a silent or replaced host asked for, but for pulses that may finish. */
  endForSilence(reason: number): void {
    this.#endUnrisen(ALL_OUTPUTS, reason);
    for (let n = 0; n < this.lines.length; n++) {
      const line = this.lines[n]!;
      if (line.owner !== 'command') continue;
      if (!line.on || !line.finishOnSilence) this.stop(n, reason);
      else if (line.moreToCome) line.end(reason);
    }
    this.schedule();
  }

  /** Ends armed slots: those that `ends` names by slot number. */
  endSlots(reason: number, ends: (slot: number, output: number) => boolean): void {
    let cleared = false;
    for (let n = 0; n < this.slots.slots.length; n++) {
      const slot = this.slots.slots[n]!;
      if (!slot.armed || !ends(n, slot.output)) continue;
      slot.armed = false;
      cleared = true;
      this.#voice.outcome(slot.id, OUTCOME.disarmed, reason, slot.output, 0);
    }
    if (cleared) this.slots.refresh(this.#voice.count);
  }

  /** Is the id armed or waiting? One that has risen has an outcome, and is not asked for here. */
  pending(id: number): boolean {
    return this.waiting.has(id) || this.slots.slots.some((slot) => slot.armed && slot.id === id);
  }

  /** As at reset: nothing owned, armed, waiting or remembered. */
  reset(): void {
    for (let n = 0; n < this.lines.length; n++) {
      const line = this.lines[n]!;
      const { on } = line;
      line.reset();
      if (on) this.probe(n, false, this.#voice.nowUs);
    }
    for (const slot of this.slots.slots) slot.armed = false;
    this.slots.refresh(0);
    this.waiting.clear(ALL_OUTPUTS, () => {});
    this.schedule();
  }

  /** Call after anything that may change when an output acts next. */
  schedule(): void {
    let nextUs = this.waiting.nextUs;
    for (const line of this.lines) if (line.nextUs < nextUs) nextUs = line.nextUs;
    this.nextUs = nextUs;
  }

  #endUnrisen(mask: number, reason: number): void {
    this.endSlots(reason, (_, output) => (mask & (1 << output)) !== 0);
    this.waiting.clear(mask, (pulse) => {
      this.#voice.outcome(pulse.id, OUTCOME.disarmed, reason, pulse.output, 0);
    });
  }

  #rose(output: number, line: OutputLine): void {
    this.#voice.outputs |= 1 << output;
    this.probe(output, true, this.#voice.nowUs);
    if (line.owner === 'sync') this.#voice.syncEdge(output, 1);
  }

  #fall(output: number, line: OutputLine): void {
    const over = line.fall(this.#voice.nowUs);
    this.#voice.outputs &= ~(1 << output);
    this.probe(output, false, this.#voice.nowUs);
    if (line.owner === 'sync') this.#voice.syncEdge(output, 0);
    else if (over) this.#done(output, line, line.ending);
  }

  #done(output: number, line: OutputLine, reason: number): void {
    const { id, onUs } = line;
    line.release();
    this.#voice.outcome(id, OUTCOME.done, reason, output, onUs);
  }
}
