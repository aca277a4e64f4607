import type { Beat, Sample } from '../../wire/messages.js';
import { SAMPLE_FIELDS as F } from './sampleSchema.js';

/** A block is closed at this many samples: one second at 1 kHz. */
export const MOST_SAMPLES = 1000;
/** Nor does it span more than this: far from where 32-bit time is ambiguous, or goes back. */
const MOST_US = 10_000_000;
const MOST_BEATS = 64;
const MOST_VARINT = 5;
/** Header fields, three beat arrays and the lengths of five arrays. */
const MOST_BYTES = 128 + MOST_SAMPLES * 2 * MOST_VARINT + MOST_BEATS * 3 * MOST_VARINT;

/**
 * Gathers samples into one protobuf message (`sampleSchema.ts`). One instance serves a whole
 * recording; nothing is allocated per sample or per block.
 */
export class SampleBlock {
  /** Samples gathered. */
  samples = 0;
  /** Raw board time of the newest sample. */
  lastBoardUs = 0;
  /** Raw board time of the first. */
  firstBoardUs = 0;
  #input = 0;
  #firstCount = 0;
  #lastCount = 0;
  #inputs = 0;
  #outputs = 0;
  #illegal = 0;
  #badFrames = 0;
  #overruns = 0;
  #beats = 0;
  readonly #times = new Uint8Array(MOST_SAMPLES * MOST_VARINT);
  #timesEnd = 0;
  readonly #counts = new Uint8Array(MOST_SAMPLES * MOST_VARINT);
  #countsEnd = 0;
  readonly #beatAfter = new Uint32Array(MOST_BEATS);
  readonly #beatFinished = new Int32Array(MOST_BEATS);
  readonly #beatWanted = new Uint32Array(MOST_BEATS);
  readonly #out = new Uint8Array(MOST_BYTES);

  /** Adds the sample if it belongs in this block; false if the block must be closed first. */
  add(input: number, m: Sample): boolean {
    const n = this.samples;
    if (n === 0) {
      this.#begin(input, m);
      return true;
    }
    if (
      n === MOST_SAMPLES ||
      input !== this.#input + n ||
      m.inputs !== this.#inputs ||
      m.outputs !== this.#outputs ||
      m.illegal !== this.#illegal ||
      m.badFrames !== this.#badFrames ||
      m.overruns !== this.#overruns ||
      (m.boardUs - this.firstBoardUs) >>> 0 > MOST_US
    )
      return false;
    this.#timesEnd = writeVarint(this.#times, this.#timesEnd, (m.boardUs - this.lastBoardUs) >>> 0);
    const step = (m.count - this.#lastCount) | 0;
    this.#countsEnd = writeVarint(
      this.#counts,
      this.#countsEnd,
      ((step << 1) ^ (step >> 31)) >>> 0,
    );
    this.lastBoardUs = m.boardUs;
    this.#lastCount = m.count;
    this.samples = n + 1;
    return true;
  }

  /** Adds a heartbeat sent after the newest sample; false if it must be written by itself. */
  addBeat(input: number, m: Beat): boolean {
    const n = this.samples;
    const beats = this.#beats;
    if (n === 0 || input !== this.#input + n - 1 || beats === MOST_BEATS) return false;
    this.#beatAfter[beats] = n - 1;
    this.#beatFinished[beats] = m.finishedUs - this.lastBoardUs;
    this.#beatWanted[beats] = m.wanted;
    this.#beats = beats + 1;
    return true;
  }

  #begin(input: number, m: Sample): void {
    this.#input = input;
    this.firstBoardUs = this.lastBoardUs = m.boardUs;
    this.#firstCount = this.#lastCount = m.count;
    this.#inputs = m.inputs;
    this.#outputs = m.outputs;
    this.#illegal = m.illegal;
    this.#badFrames = m.badFrames;
    this.#overruns = m.overruns;
    this.#timesEnd = this.#countsEnd = this.#beats = 0;
    this.samples = 1;
  }

  /** Ends the block and returns it encoded: a view that the next block overwrites. */
  close(): Uint8Array {
    const out = this.#out;
    let at = writeField(out, 0, F.input.tag, this.#input);
    at = writeField(out, at, F.boardUs.tag, this.firstBoardUs >>> 0);
    const first = this.#firstCount;
    at = writeField(out, at, F.count.tag, ((first << 1) ^ (first >> 31)) >>> 0);
    at = writeField(out, at, F.inputs.tag, this.#inputs);
    at = writeField(out, at, F.outputs.tag, this.#outputs);
    at = writeField(out, at, F.illegal.tag, this.#illegal);
    at = writeField(out, at, F.badFrames.tag, this.#badFrames);
    at = writeField(out, at, F.overruns.tag, this.#overruns);
    at = writeField(out, at, F.samples.tag, this.samples);
    at = writePacked(out, at, F.boardUsDeltas.tag, this.#times, this.#timesEnd);
    at = writePacked(out, at, F.countDeltas.tag, this.#counts, this.#countsEnd);
    if (this.#beats > 0) at = this.#writeBeats(at);
    this.samples = 0;
    return out.subarray(0, at);
  }

  #writeBeats(start: number): number {
    const out = this.#out;
    // The sample arrays are in `out` already, so their space can be used again.
    const scratch = this.#times;
    const n = this.#beats;
    let end = 0;
    for (let i = 0; i < n; i++) end = writeVarint(scratch, end, this.#beatAfter[i]!);
    let at = writePacked(out, start, F.beatAfter.tag, scratch, end);
    end = 0;
    for (let i = 0; i < n; i++) {
      const value = this.#beatFinished[i]!;
      end = writeVarint(scratch, end, ((value << 1) ^ (value >> 31)) >>> 0);
    }
    at = writePacked(out, at, F.beatFinishedUs.tag, scratch, end);
    end = 0;
    for (let i = 0; i < n; i++) end = writeVarint(scratch, end, this.#beatWanted[i]!);
    return writePacked(out, at, F.beatWanted.tag, scratch, end);
  }
}

/** A varint of up to 53 bits. Division above 32 bits: bit operations would cut it. */
function writeVarint(out: Uint8Array, start: number, value: number): number {
  let at = start;
  let left = value;
  while (left > 0xffff_ffff) {
    out[at++] = (left % 128) | 0x80;
    left = Math.floor(left / 128);
  }
  while (left > 0x7f) {
    out[at++] = (left & 0x7f) | 0x80;
    left >>>= 7;
  }
  out[at++] = left;
  return at;
}

/** proto3 leaves out a field that is zero. */
function writeField(out: Uint8Array, at: number, tag: number, value: number): number {
  if (value === 0) return at;
  out[at] = tag;
  return writeVarint(out, at + 1, value);
}

function writePacked(
  out: Uint8Array,
  start: number,
  tag: number,
  values: Uint8Array,
  length: number,
): number {
  if (length === 0) return start;
  out[start] = tag;
  const at = writeVarint(out, start + 1, length);
  // `set` on a fresh subarray costs more than the loop for the short blocks of a live session.
  if (length > 64) out.set(values.subarray(0, length), at);
  else for (let i = 0; i < length; i++) out[at + i] = values[i]!;
  return at + length;
}
