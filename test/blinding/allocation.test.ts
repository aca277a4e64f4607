import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { Ajv2020 } from 'ajv/dist/2020.js';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  commitmentOf,
  inBlocks,
  newKey,
  openAll,
  openSlot,
  sealAllocation,
  slotFor,
} from '../../server/session/blinding/allocation.js';

const SCHEMA = new URL('../../server/session/blinding/allocation.schema.json', import.meta.url);
const ABOUT = { madeAt: '2026-12-01T12:00:00.000+00:00', by: 'kl', how: 'by a list' };
const SLOTS = [
  { subject: 'm31', session: null, arm: 'stimulation' },
  { subject: 'm32', session: null, arm: 'no' },
  { subject: 'm33', session: 1, arm: 'no' },
  { subject: 'm33', session: 2, arm: 'stimulation' },
];
const key = newKey();
const sealed = sealAllocation(SLOTS, key, ABOUT);

describe('a sealed allocation', () => {
  it('is opened by its key alone, each arm and all of them', () => {
    expect(sealed.slots.map((slot) => openSlot(sealed.id, slot, key))).toEqual(
      SLOTS.map(({ arm }) => arm),
    );
    expect(openAll(sealed, key).slots).toEqual(SLOTS);
    expect(() => openSlot(sealed.id, sealed.slots[0]!, newKey())).toThrow(/does not open/);
    expect(() => openAll(sealed, 'abc')).toThrow(/64 hexadecimal digits/);
  });

  it('tells nothing by the length, the order or the likeness of what is sealed', () => {
    expect(new Set(sealed.slots.map(({ sealed: text }) => text.length)).size).toBe(1);
    expect(new Set(sealed.slots.map(({ sealed: text }) => text)).size).toBe(SLOTS.length);
    const again = sealAllocation(SLOTS, key, ABOUT);
    expect(again.commitment).not.toBe(sealed.commitment);
    expect(JSON.stringify(sealed.slots)).not.toMatch(/stimulation/);
  });

  it('is committed to by SHA-256 over its arms and a nonce, as anybody can reckon', () => {
    const { id, nonce, slots } = openAll(sealed, key);
    const lines = slots.map(({ subject, session, arm }) => [subject, session, arm]);
    const digest = createHash('sha256')
      .update(JSON.stringify([id, nonce, lines]))
      .digest('hex');
    expect(digest).toBe(sealed.commitment);
    const other = slots.map((slot, n) => (n === 0 ? { ...slot, arm: 'no' } : slot));
    expect(commitmentOf({ id, nonce, slots: other })).not.toBe(sealed.commitment);
  });

  it('does not open when anything in it was moved or altered', () => {
    const [first, second] = sealed.slots;
    expect(() => openSlot(sealed.id, { ...first!, sealed: second!.sealed }, key)).toThrow();
    expect(() => openSlot(sealed.id, { ...first!, subject: 'm99' }, key)).toThrow();
    const swapped = [second!, first!, ...sealed.slots.slice(2)];
    expect(() => openAll({ ...sealed, slots: swapped }, key)).toThrow(/committed/);
    expect(() => openAll({ ...sealed, slots: sealed.slots.slice(1) }, key)).toThrow(/committed/);
    const bytes = Buffer.from(first!.sealed, 'base64');
    fc.assert(
      fc.property(fc.nat(bytes.length - 1), fc.integer({ min: 1, max: 255 }), (at, flip) => {
        const altered = Buffer.from(bytes);
        altered[at]! ^= flip;
        const text = altered.toString('base64');
        expect(() => openSlot(sealed.id, { ...first!, sealed: text }, key)).toThrow(/altered/);
      }),
      { seed: 3, numRuns: 200 },
    );
  });

  it('has one slot for a session, or says which there are', () => {
    expect(slotFor(sealed, 'm31', 7)).toBe(sealed.slots[0]);
    expect(slotFor(sealed, 'm33', 2)).toBe(sealed.slots[3]);
    expect(() => slotFor(sealed, 'm33', 3)).toThrow(/m33, session 1, m33, session 2/);
    expect(() => slotFor(sealed, 'm13', 1)).toThrow(/it has none/);
  });

  it('is refused where slots clash, or there is nothing to hide', () => {
    const seal = (slots: typeof SLOTS) => () => sealAllocation(slots, key, ABOUT);
    expect(seal([...SLOTS, SLOTS[0]!])).toThrow(/stands twice/);
    expect(seal([...SLOTS, { subject: 'm31', session: 2, arm: 'no' }])).toThrow(
      /every session and/,
    );
    expect(seal([SLOTS[0]!])).toThrow(/two arms/);
    expect(seal([{ ...SLOTS[0]!, arm: 'x'.repeat(80) }, SLOTS[1]!])).toThrow(/too long/);
  });

  it('fits its schema', () => {
    const check = new Ajv2020({ strict: false }).compile(JSON.parse(readFileSync(SCHEMA, 'utf8')));
    expect(check(sealed), JSON.stringify(check.errors)).toBe(true);
    expect(check({ ...sealed, arm: 'stim' })).toBe(false);
  });
});

describe('permuted blocks', () => {
  const animals = Array.from({ length: 24 }, (_, n) => `m${n}`);

  it('balance the arms in every block, whatever the seed', () => {
    fc.assert(
      fc.property(fc.string(), fc.constantFrom(2, 4, 6), (seed, size) => {
        const arms = inBlocks(animals, null, ['stim', 'sham'], size, seed).map(({ arm }) => arm);
        for (let n = 0; n < arms.length; n += size) {
          const block = arms.slice(n, n + size);
          expect(block.filter((arm) => arm === 'stim')).toHaveLength(size / 2);
        }
      }),
      { seed: 4, numRuns: 100 },
    );
  });

  it('are the same for a seed, others for another, and give every order of a block', () => {
    const arms = (seed: string) => inBlocks(animals, null, ['a', 'b'], 4, seed).map((s) => s.arm);
    expect(arms('x')).toEqual(arms('x'));
    expect(arms('x')).not.toEqual(arms('y'));
    const blocks = new Set<string>();
    for (let n = 0; n < 40; n++) {
      const all = arms(`seed ${n}`).join('');
      for (let at = 0; at < 24; at += 4) blocks.add(all.slice(at, at + 4));
    }
    // 4 things of two kinds, two each: 6 orders.
    expect(blocks.size).toBe(6);
  });

  it('number the sessions of an animal, and refuse a block that cannot balance', () => {
    const slots = inBlocks(['m1', 'm2'], 3, ['a', 'b'], 2, 'x');
    expect(slots.map(({ subject, session }) => `${subject} ${session}`)).toEqual([
      ...['m1 1', 'm1 2', 'm1 3', 'm2 1', 'm2 2', 'm2 3'],
    ]);
    expect(() => inBlocks(['m1'], null, ['a', 'b'], 3, 'x')).toThrow(/cannot balance 2 arms/);
  });
});
