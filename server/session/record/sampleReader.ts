import type { Beat, Sample } from '../../wire/messages.js';
import { SAMPLE_FIELDS as F } from './sampleSchema.js';

export interface SampleVisitor {
  /** `sample` is reused: take what is needed before returning. */
  sample?(input: number, sample: Sample): void;
  /** A heartbeat the host sent after input `input`; reused likewise. */
  beat?(input: number, beat: Beat): void;
}

/** Decodes blocks of samples (`sampleSchema.ts`) into one reused sample. */
export class SampleReader {
  /** Raw board times of the first and the last sample of the block read last. */
  firstBoardUs = 0;
  lastBoardUs = 0;
  readonly #sample: Sample = {
    boardUs: 0,
    count: 0,
    inputs: 0,
    outputs: 0,
    illegal: 0,
    badFrames: 0,
    overruns: 0,
  };
  readonly #beat: Beat = { finishedUs: 0, wanted: 0 };
  /** Where the arrays of the block being read begin and end. */
  readonly #from = new Int32Array(16);
  readonly #to = new Int32Array(16);
  #at = 0;

  /**
   * Hands over every sample of the block and returns the sequence number of the last one. Throws `RangeError` where the bytes are no such block.
   */
  read(data: Uint8Array, start: number, end: number, visitor: SampleVisitor): number {
    const sample = this.#sample;
    sample.boardUs = sample.count = sample.inputs = sample.outputs = 0;
    sample.illegal = sample.badFrames = sample.overruns = 0;
    const from = this.#from.fill(0);
    const to = this.#to.fill(0);
    let input = 0;
    let samples = 0;
    this.#at = start;
    while (this.#at < end) {
      const tag = this.#varint(data, end);
      const value = this.#varint(data, end);
      switch (tag) {
        case F.input.tag:
          input = value;
          break;
        case F.boardUs.tag:
          sample.boardUs = value;
          break;
        case F.count.tag:
          sample.count = (value >>> 1) ^ -(value & 1);
          break;
        case F.inputs.tag:
          sample.inputs = value;
          break;
        case F.outputs.tag:
          sample.outputs = value;
          break;
        case F.illegal.tag:
          sample.illegal = value;
          break;
        case F.badFrames.tag:
          sample.badFrames = value;
          break;
        case F.overruns.tag:
          sample.overruns = value;
          break;
        case F.samples.tag:
          samples = value;
          break;
        default: {
          if ((tag & 7) === 0) break;
          if ((tag & 7) !== 2 || this.#at + value > end) throw malformed();
          const number = tag >>> 3;
          if (number < 16) {
            from[number] = this.#at;
            to[number] = this.#at + value;
          }
          this.#at += value;
        }
      }
    }
    if (samples === 0) throw malformed();
    this.firstBoardUs = sample.boardUs;
    this.#replay(data, input, samples, visitor);
    this.lastBoardUs = sample.boardUs;
    return input + samples - 1;
  }

  #replay(data: Uint8Array, input: number, samples: number, visitor: SampleVisitor): void {
    const sample = this.#sample;
    const from = this.#from;
    let times = from[F.boardUsDeltas.number]!;
    const timesEnd = this.#to[F.boardUsDeltas.number]!;
    let counts = from[F.countDeltas.number]!;
    const countsEnd = this.#to[F.countDeltas.number]!;
    const beats = visitor.beat === undefined ? 0 : this.#to[F.beatAfter.number]!;
    let nextBeat = from[F.beatAfter.number]! < beats ? this.#beatAfter(data) : -1;
    for (let i = 0; ; ) {
      visitor.sample?.(input + i, sample);
      while (i === nextBeat) {
        this.#tellBeat(data, input + i, visitor);
        nextBeat = from[F.beatAfter.number]! < beats ? this.#beatAfter(data) : -1;
      }
      if (++i === samples) break;
      // Both varints are read in line: this loop is most of a replay's decoding.
      let byte = data[times++]!;
      let value = byte & 0x7f;
      for (let shift = 7; byte > 0x7f; shift += 7) {
        byte = data[times++]!;
        value |= (byte & 0x7f) << shift;
      }
      sample.boardUs = (sample.boardUs + value) >>> 0;
      byte = data[counts++]!;
      value = byte & 0x7f;
      for (let shift = 7; byte > 0x7f; shift += 7) {
        byte = data[counts++]!;
        value |= (byte & 0x7f) << shift;
      }
      sample.count = (sample.count + ((value >>> 1) ^ -(value & 1))) | 0;
      if (times > timesEnd || counts > countsEnd) throw malformed();
    }
    if (times !== timesEnd || counts !== countsEnd) throw malformed();
  }

  #beatAfter(data: Uint8Array): number {
    return this.#next(data, F.beatAfter.number);
  }

  #tellBeat(data: Uint8Array, input: number, visitor: SampleVisitor): void {
    const beat = this.#beat;
    const value = this.#next(data, F.beatFinishedUs.number);
    beat.finishedUs = (this.#sample.boardUs + ((value >>> 1) ^ -(value & 1))) >>> 0;
    beat.wanted = this.#next(data, F.beatWanted.number);
    visitor.beat!(input, beat);
  }

  /** The next value of a packed array. */
  #next(data: Uint8Array, number: number): number {
    this.#at = this.#from[number]!;
    const value = this.#varint(data, this.#to[number]!);
    this.#from[number] = this.#at;
    return value;
  }

  #varint(data: Uint8Array, end: number): number {
    let value = 0;
    let scale = 1;
    for (let i = 0; i < 10; i++) {
      if (this.#at >= end) throw malformed();
      const byte = data[this.#at++]!;
      value += (byte & 0x7f) * scale;
      if (byte < 0x80) return value;
      scale *= 128;
    }
    throw malformed();
  }
}

function malformed(): RangeError {
  return new RangeError('not a block of samples');
}
