import type { Edge, Sample } from '../../server/wire/messages.js';

/** A small generator of numbers in [0, 1) (mulberry32, from memory), so that a seed says it all. */
export function dice(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let mixed = Math.imul(state ^ (state >>> 15), 1 | state);
    mixed = (mixed + Math.imul(mixed ^ (mixed >>> 7), 61 | mixed)) ^ mixed;
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 0x1_0000_0000;
  };
}

export interface BeltModelOptions {
  readonly lapCounts: number;
  readonly direction?: 1 | -1;
  readonly startUs?: number;
  readonly startCount?: number;
  /** Where the belt stands at first: counts past the mark's leading edge. */
  readonly startBelt?: number;
  readonly markWidth?: number;
  readonly seamInput?: number;
  /** Extra edge pairs at every crossing of the mark's edges. */
  readonly bounces?: number;
  /** Asked as the belt comes onto the mark: true makes the sensor miss the pass. */
  readonly misses?: () => boolean;
  /** Asked for each edge: true holds it back until after the next sample. */
  readonly overtaken?: () => boolean;
}

export type Told = (kind: 'sample' | 'edge', message: Sample | Edge) => void;

/**
 * A belt with a mark, and a board that reports it, both in whole counts: the truth that the tracker
 * must find. The mark's strip covers belt counts 0 to `markWidth` of every lap.
 */
export class BeltModel {
  nowUs: number;
  /** True belt travel, and the furthest of it. */
  belt: number;
  furthest: number;
  /** The encoder's count in the animal's forward direction; slip sets it apart from the belt. */
  encoder = 0;
  inputs = 0;
  outputs = 0;
  readonly lapCounts: number;
  readonly #options: BeltModelOptions;
  readonly #tell: Told;
  readonly #direction: 1 | -1;
  readonly #markWidth: number;
  readonly #seamInput: number;
  #inside: boolean;
  #missedAt = Number.NEGATIVE_INFINITY;
  #held: Edge[] = [];
  #lastSampleUs = Number.NEGATIVE_INFINITY;
  #lastSample = '';

  constructor(options: BeltModelOptions, tell: Told) {
    this.#options = options;
    this.#tell = tell;
    this.lapCounts = options.lapCounts;
    this.#direction = options.direction ?? 1;
    this.#markWidth = options.markWidth ?? 10;
    this.#seamInput = options.seamInput ?? 1;
    this.nowUs = options.startUs ?? 1000;
    this.belt = options.startBelt ?? -100;
    this.furthest = this.belt;
    this.#inside = this.#onMark();
  }

  /** The count on the board, 32 bits. */
  get count(): number {
    return ((this.#options.startCount ?? 0) + this.encoder * this.#direction) | 0;
  }

  /** The belt moves `counts` evenly over `us`, telling edges on the way and no sample. */
  move(counts: number, us: number): void {
    const step = Math.sign(counts);
    const beganUs = this.nowUs;
    for (let i = 1; i <= Math.abs(counts); i++) {
      this.nowUs = beganUs + Math.floor((us * i) / Math.abs(counts));
      this.belt += step;
      this.encoder += step;
      if (this.belt > this.furthest) this.furthest = this.belt;
      this.#lookAtMark();
    }
    this.nowUs = beganUs + us;
  }

  /** The encoder turns by `counts` against a belt that stands still. */
  slip(counts: number): void {
    this.encoder += counts;
  }

  /** A sample if one is due now: after a change, or 5 ms after the last. */
  sampleIfDue(): void {
    const shown = `${this.count} ${this.inputs} ${this.outputs}`;
    if (shown !== this.#lastSample || this.nowUs - this.#lastSampleUs >= 5000) this.sample();
  }

  sample(): void {
    this.#lastSample = `${this.count} ${this.inputs} ${this.outputs}`;
    this.#lastSampleUs = this.nowUs;
    this.#tell('sample', {
      boardUs: this.nowUs >>> 0,
      count: this.count,
      inputs: this.inputs,
      outputs: this.outputs,
      illegal: 0,
      badFrames: 0,
      overruns: 0,
    });
    const held = this.#held;
    this.#held = [];
    for (const edge of held) this.#tell('edge', edge);
  }

  /** Runs `counts` at `countsPerMs`, a sample every millisecond. */
  run(counts: number, countsPerMs = 1): void {
    let left = Math.abs(counts);
    while (left > 0) {
      const now = Math.min(left, countsPerMs);
      this.move(now * Math.sign(counts), 1000);
      this.sampleIfDue();
      left -= now;
    }
  }

  /** Stands still, the board sampling on. */
  rest(us: number): void {
    const endUs = this.nowUs + us;
    while (this.nowUs < endUs) {
      this.nowUs = Math.min(endUs, this.nowUs + 1000);
      this.sampleIfDue();
    }
  }

  /** An input changes now. */
  edge(input: number, level: 0 | 1): void {
    this.inputs = level === 1 ? this.inputs | (1 << input) : this.inputs & ~(1 << input);
    this.#sayEdge({ boardUs: this.nowUs >>> 0, count: this.count, input, level });
  }

  #lookAtMark(): void {
    // A sensor that misses the mark misses it for as long as the belt trembles there.
    const missing = Math.abs(this.belt - this.#missedAt) <= this.#markWidth + 30;
    if (!missing) this.#missedAt = Number.NEGATIVE_INFINITY;
    const inside = this.#onMark();
    if (inside === this.#inside) return;
    this.#inside = inside;
    if (missing) return;
    if (inside && this.#options.misses?.()) {
      this.#missedAt = this.belt;
      return;
    }
    const level = inside ? 1 : 0;
    this.edge(this.#seamInput, level);
    for (let i = 0; i < (this.#options.bounces ?? 0); i++) {
      this.edge(this.#seamInput, level === 1 ? 0 : 1);
      this.edge(this.#seamInput, level);
    }
  }

  #onMark(): boolean {
    const inLap = this.belt - Math.floor(this.belt / this.lapCounts) * this.lapCounts;
    return inLap < this.#markWidth;
  }

  #sayEdge(edge: Edge): void {
    // Edges keep their order among themselves, whatever overtakes them.
    if (this.#held.length > 0 || this.#options.overtaken?.()) this.#held.push(edge);
    else this.#tell('edge', edge);
  }
}
