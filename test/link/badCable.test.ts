import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { MessageOf } from '../../server/wire/messages.js';
import { FaultyPort } from './faultyPort.js';
import { VirtualLink } from './virtualLink.js';

type Said =
  | { name: 'sample'; message: Partial<MessageOf['sample']> }
  | { name: 'edge'; message: Partial<MessageOf['edge']> }
  | { name: 'outcome'; message: Partial<MessageOf['outcome']> }
  | { name: 'clock'; message: Partial<MessageOf['clock']> };

const u32 = fc.nat({ max: 0xffff_ffff });
const i32 = fc.integer({ min: -0x8000_0000, max: 0x7fff_ffff });
const said: fc.Arbitrary<Said> = fc.oneof(
  fc.record({
    name: fc.constant('sample' as const),
    message: fc.record({ boardUs: u32, count: i32, inputs: fc.nat(0xffff) }),
  }),
  fc.record({
    name: fc.constant('edge' as const),
    message: fc.record({ boardUs: u32, count: i32, input: fc.nat(255), level: fc.nat(1) }),
  }),
  fc.record({
    name: fc.constant('outcome' as const),
    message: fc.record({ id: u32, boardUs: u32, count: i32, onUs: u32 }),
  }),
  fc.record({
    name: fc.constant('clock' as const),
    message: fc.record({ boardUs: u32, wraps: fc.nat(0xffff) }),
  }),
);
const pieces = fc.array(fc.integer({ min: 1, max: 90 }), { minLength: 1, maxLength: 8 });
const SEED = 20_240;

/** A link that is up behind a faulty port, with nothing said yet but the handshake. */
async function linkOver(lengths: readonly number[]) {
  const rig = new VirtualLink();
  let port!: FaultyPort;
  rig.wrap = (inner) => {
    port = new FaultyPort(inner, lengths);
    return port;
  };
  await rig.up();
  rig.sample(false);
  rig.handler.heard.length = 0;
  return { rig, port };
}

const whatOf = (words: readonly Said[]) =>
  words.map(({ name, message }) => ({ what: name, message }));

describe('a bad cable', () => {
  it('gives the same messages in whatever pieces they come', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(said, { maxLength: 60 }), pieces, async (words, lengths) => {
        const { rig } = await linkOver(lengths);
        const run = words.map((word) => rig.board.bytesOf(word.name, word.message));
        rig.cable.send(Buffer.concat(run));
        expect(rig.handler.messages).toMatchObject(whatOf(words));
        expect(rig.handler.messages.length).toBe(words.length);
        expect(rig.link.counters).toMatchObject({ bad: 0, lost: 0, foreign: 0 });
      }),
      { seed: SEED, numRuns: 150 },
    );
  });

  it('loses only the frames that were hit, in order, and counts each of them', async () => {
    const hits = fc.array(fc.nat(4_000), { maxLength: 12 });
    await fc.assert(
      fc.asyncProperty(
        fc.array(said, { minLength: 1, maxLength: 60 }),
        pieces,
        hits,
        hits,
        async (words, lengths, flipped, lost) => {
          const { rig, port } = await linkOver(lengths);
          port.damage(new Set(flipped), new Set(lost));
          const frames = words.map((word) => rig.board.bytesOf(word.name, word.message));
          rig.cable.send(Buffer.concat(frames));
          // The frame behind a lost delimiter is lost with it, so a delimiter and a whole frame
          // end the run; by its number the loss of the last is seen too.
          port.damage(new Set(), new Set());
          rig.cable.send(Uint8Array.of(0));
          rig.board.say('clock', { boardUs: 1, wraps: 1 });
          const heard = rig.handler.messages.slice(0, -1);
          expect(heard.length + rig.link.counters.lost).toBe(words.length);
          const untouched = survivors(words, frames, [...flipped, ...lost]);
          expect(heard).toMatchObject(whatOf(untouched));
        },
      ),
      { seed: SEED, numRuns: 150 },
    );
  });

  it('takes no harm from a cable pulled in the middle of a frame and put back', async () => {
    await fc.assert(
      fc.asyncProperty(fc.integer({ min: 1, max: 20 }), pieces, async (cut, lengths) => {
        const { rig } = await linkOver(lengths);
        const torn = rig.board.bytesOf('edge', { input: 1 });
        rig.cable.send(torn.subarray(0, Math.min(cut, torn.length - 1)));
        rig.cable.unplug();
        await rig.timers.advance(150);
        rig.board.say('edge', { input: 2 });
        expect(rig.handler.of('edge').map((item) => item.message.input)).toEqual([2]);
        expect(rig.handler.of('gap')).toEqual([]);
      }),
      { seed: SEED, numRuns: 60 },
    );
  });

  it('goes down when all is held back for 250 ms, and what then comes late is not believed', async () => {
    const { rig, port } = await linkOver([64]);
    port.holding = true;
    rig.board.say('edge', { input: 1 });
    await rig.timers.advance(300);
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_SILENT']);
    port.release();
    expect(rig.handler.of('edge')).toEqual([]);
  });
});

/** The words none of whose bytes (delimiters on either side included) was hit. */
function survivors(words: readonly Said[], frames: readonly Uint8Array[], hits: number[]): Said[] {
  let end = 0;
  return words.filter((_, n) => {
    const start = end;
    end += frames[n]!.length;
    // The delimiter before a frame is the last byte of the one before it.
    return !hits.some((at) => at >= start - 1 && at < end);
  });
}
