/** Decoder throughput and garbage: framed bytes in, messages out into objects made once. */
import { blank, FrameEncoder } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';

export interface WireBench {
  readonly decodedMBPerS: number;
  readonly framesPerS: number;
  /** Heap bytes allocated per frame decoded and read, over many frames. */
  readonly allocatedBytesPerFrame: number;
  readonly encodedFramesPerS: number;
}

const FRAMES = 50_000;
const ROUNDS = 24;

/** Mostly samples with an edge in every 32, as an animal's session has. */
function line(): Uint8Array {
  const encoder = new FrameEncoder();
  const sample = blank('sample');
  const edge = blank('edge');
  const chunks: Uint8Array[] = [];
  for (let n = 0; n < FRAMES; n++) {
    // Times on both sides of 2^31: the larger ones are what costs garbage if anything does.
    sample.boardUs = (2_000_000_000 + n * 10_000) >>> 0;
    sample.count = n * 3 - 70_000;
    sample.inputs = n & 3;
    edge.boardUs = sample.boardUs + 7;
    edge.count = sample.count;
    chunks.push(
      (n & 31) === 0
        ? encoder.encode('edge', edge, 0x1234).slice()
        : encoder.encode('sample', sample, 0x1234).slice(),
    );
  }
  return Buffer.concat(chunks);
}

/** Measures the decoder on this machine, now; takes about a second. */
export function benchWire(): WireBench {
  const bytes = line();
  const sample = blank('sample');
  const edge = blank('edge');
  let frames = 0;
  let sum = 0;
  const decoder = new FrameDecoder({
    frame(frame) {
      frames++;
      if (frame.shape.name === 'sample') {
        frame.read(sample);
        sum = (sum + sample.count) | 0;
      } else {
        frame.read(edge);
        sum = (sum + edge.count) | 0;
      }
    },
    bad(why) {
      throw new Error(`the bench's own frames are bad: ${why}`);
    },
  });
  // As a serial port hands them over: some frames at a time, cut anywhere.
  const pieces: Uint8Array[] = [];
  for (let at = 0; at < bytes.length; at += 500) pieces.push(bytes.subarray(at, at + 500));

  let bestS = Number.POSITIVE_INFINITY;
  let leastHeap = Number.POSITIVE_INFINITY;
  let emptyHeap = Number.POSITIVE_INFINITY;
  for (let round = 0; round < ROUNDS; round++) {
    const heap = process.memoryUsage().heapUsed;
    const from = performance.now();
    for (const piece of pieces) decoder.push(piece);
    const seconds = (performance.now() - from) / 1000;
    const grown = process.memoryUsage().heapUsed - heap;
    // Looking at the heap puts something on it, too.
    const before = process.memoryUsage().heapUsed;
    emptyHeap = Math.min(emptyHeap, process.memoryUsage().heapUsed - before);
    // The first rounds compile, and one with a collection in it shrinks: it says nothing. Asking for
    // collections would throw away the compiled code and measure the interpreter.
    if (round > ROUNDS / 2 && grown >= 0) leastHeap = Math.min(leastHeap, grown);
    bestS = Math.min(bestS, seconds);
  }
  if (frames !== FRAMES * ROUNDS || sum === 1) throw new Error('the bench lost frames');
  return {
    decodedMBPerS: bytes.length / bestS / 1e6,
    framesPerS: FRAMES / bestS,
    allocatedBytesPerFrame: Math.max(0, leastHeap - emptyHeap) / FRAMES,
    encodedFramesPerS: encodeRate(),
  };
}

function encodeRate(): number {
  const encoder = new FrameEncoder();
  const sample = blank('sample');
  let bestS = Number.POSITIVE_INFINITY;
  let total = 0;
  for (let round = 0; round < ROUNDS; round++) {
    const from = performance.now();
    for (let n = 0; n < FRAMES; n++) {
      sample.boardUs = n;
      sample.count = n;
      total += encoder.encode('sample', sample, 7).length;
    }
    bestS = Math.min(bestS, (performance.now() - from) / 1000);
  }
  if (total === 0) throw new Error('nothing was encoded');
  return FRAMES / bestS;
}
