import type { Instant, Trust } from '../rules/instant.js';
import type { Sample } from '../wire/messages.js';

export const TRUSTS: readonly Trust[] = ['unknown', 'doubtful', 'trusted'];

/** What each sample showed, a column a quantity: an hour at 1 kHz takes about 160 MB. */
export class SampleColumns {
  length = 0;
  /** Number of the engine input that each sample was. */
  input = new Float64Array(4096);
  /** Extended board time, microseconds. */
  boardUs = new Float64Array(4096);
  /** The encoder's own count. */
  count = new Int32Array(4096);
  /** NaN while position is unknown. */
  positionCm = new Float64Array(4096);
  speedCmPerS = new Float64Array(4096);
  lap = new Int32Array(4096);
  /** Index into `TRUSTS`. */
  trust = new Uint8Array(4096);
  /** Bit n: input n is active, output n is on. */
  inputs = new Uint16Array(4096);
  outputs = new Uint16Array(4096);

  push(input: number, instant: Instant, sample: Sample): void {
    if (this.length === this.input.length) this.#grow();
    const i = this.length++;
    this.input[i] = input;
    this.boardUs[i] = instant.nowUs;
    this.count[i] = sample.count;
    this.positionCm[i] = instant.placed ? instant.positionCm : Number.NaN;
    this.speedCmPerS[i] = instant.speedCmPerS;
    this.lap[i] = instant.lap;
    this.trust[i] = TRUSTS.indexOf(instant.trust);
    this.inputs[i] = sample.inputs;
    this.outputs[i] = sample.outputs;
  }

  /** The first sample at or after a time; `length` when there is none. */
  indexAt(boardUs: number): number {
    let low = 0;
    let high = this.length;
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (this.boardUs[middle]! < boardUs) low = middle + 1;
      else high = middle;
    }
    return low;
  }

  #grow(): void {
    const size = this.input.length * 2;
    this.input = larger(this.input, new Float64Array(size));
    this.boardUs = larger(this.boardUs, new Float64Array(size));
    this.count = larger(this.count, new Int32Array(size));
    this.positionCm = larger(this.positionCm, new Float64Array(size));
    this.speedCmPerS = larger(this.speedCmPerS, new Float64Array(size));
    this.lap = larger(this.lap, new Int32Array(size));
    this.trust = larger(this.trust, new Uint8Array(size));
    this.inputs = larger(this.inputs, new Uint16Array(size));
    this.outputs = larger(this.outputs, new Uint16Array(size));
  }
}

function larger<T extends { set(from: T): void }>(from: T, into: T): T {
  into.set(from);
  return into;
}
