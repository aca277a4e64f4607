import type { Edge } from '../wire/messages.js';
import type { LickConfig } from './beltConfig.js';
import type { TrackEvent } from './events.js';
import { LickSensor } from './lickSensor.js';

/**
 * Levels of the board's inputs and outputs: what rose and fell at this instant, and what that means
 * to the lick sensor. Edges tell exactly; samples tell what was so at the start and mend what lost
 * frames left wrong.
 */
export class InputLevels {
  /** Bit n for input n: levels now, and changes at this instant. */
  inputs = 0;
  rose = 0;
  fell = 0;
  /** Bit n for output n: on now. */
  outputs = 0;
  /** A lick began at this instant. */
  licked = false;
  readonly lick: LickSensor | null;
  readonly #lickBit: number;
  readonly #artefactOutputs: number;
  #known = false;
  /** Inputs at which the last sample disagreed with what edges told. */
  #differed = 0;

  constructor(config: LickConfig | null, events: TrackEvent[]) {
    this.lick = config === null ? null : new LickSensor(config, events);
    this.#lickBit = config === null ? 0 : 1 << config.input;
    this.#artefactOutputs = config?.artefactOutputs ?? 0xffff;
  }

  /** A new instant begins. */
  begin(): void {
    this.rose = 0;
    this.fell = 0;
    this.licked = false;
  }

  /** Levels are taken from the next sample as they are, without edges. */
  forget(): void {
    this.#known = false;
  }

  sample(inputs: number, outputs: number, stampUs: number): void {
    if (outputs !== this.outputs) {
      const changed = (outputs ^ this.outputs) & this.#artefactOutputs;
      this.outputs = outputs;
      if (changed !== 0 && this.#known) this.lick?.outputChanged(stampUs);
    }
    if (inputs !== this.inputs || this.#differed !== 0 || !this.#known) {
      this.#compare(inputs, stampUs);
    }
  }

  edge(m: Edge, stampUs: number): void {
    const rose = m.level === 1;
    const bit = 1 << m.input;
    if (rose) {
      this.inputs |= bit;
      this.rose |= bit;
    } else {
      this.inputs &= ~bit;
      this.fell |= bit;
    }
    this.#differed &= ~bit;
    if (bit === this.#lickBit) this.#lickEdge(rose, stampUs);
  }

  /** An output is known to have changed at `stampUs`. */
  outputIs(output: number, on: boolean, stampUs: number): void {
    const bit = 1 << output;
    this.outputs = on ? this.outputs | bit : this.outputs & ~bit;
    if ((bit & this.#artefactOutputs) !== 0) this.lick?.outputChanged(stampUs);
  }

  /**
   * Edges come first on the wire, so a difference that two samples show is an edge whose frame was
   * lost.
   */
  #compare(inputs: number, stampUs: number): void {
    if (!this.#known) {
      this.#known = true;
      this.inputs = inputs;
      this.#differed = 0;
      this.lick?.adopt((inputs & this.#lickBit) !== 0, stampUs);
      return;
    }
    const differs = inputs ^ this.inputs;
    const lost = differs & this.#differed;
    this.#differed = differs & ~lost;
    if (lost === 0) return;
    this.inputs ^= lost;
    this.rose = lost & inputs;
    this.fell = lost & ~inputs;
    if ((lost & this.#lickBit) !== 0) this.#lickEdge((inputs & this.#lickBit) !== 0, stampUs);
  }

  #lickEdge(rose: boolean, stampUs: number): void {
    if (this.lick === null) return;
    if (!rose) this.lick.fall(stampUs);
    else if (this.lick.rise(stampUs)) this.licked = true;
  }
}
