import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { murmur3, uniform } from '../../server/rules/engine/hash.js';
import { Stage, type StageOptions } from './stage.js';

/** Everything that a draw was, in order. */
function drawn(
  rules: string,
  run: (stage: Stage) => void,
  options?: StageOptions,
): (string | number)[] {
  const stage = new Stage(rules, options);
  run(stage);
  return stage.of('drawn').map((d) => d.value!);
}

/** A draw with every firing of a rule that fires at each lick, and so many licks. */
function perFiring(draw: string, licks: number, seed = 'seed'): (string | number)[] {
  const rules = `
draws:
  d: ${draw.replace('EVERY', 'every firing of go_on')}
rules:
  go_on:
    when: lick
    do: note
`;
  return drawn(rules, (stage) => stage.begin().lick(licks, 10), { seed, frameMs: 5 });
}

/** Pearson's statistic of observed counts against expected ones. */
function chiSquare(observed: readonly number[], expected: readonly number[]): number {
  return observed.reduce((sum, count, n) => sum + (count - expected[n]!) ** 2 / expected[n]!, 0);
}

// Upper critical values of the chi-square distribution at 0.001:
// NIST/SEMATECH e-Handbook of Statistical Methods, table 1.3.6.7.4.
const CRITICAL_999: Readonly<Record<number, number>> = {
  1: 10.828,
  2: 13.816,
  9: 27.877,
  16: 39.252,
};

describe('the hash', () => {
  test('is MurmurHash3_x86_32', () => {
    // The table of test values in the English Wikipedia's article `MurmurHash`.
    expect(murmur3('', 0)).toBe(0);
    expect(murmur3('', 1)).toBe(0x514e28b7);
    expect(murmur3('', 0xffffffff)).toBe(0x81f16f39);
    expect(murmur3('test', 0)).toBe(0xba6bd213);
    expect(murmur3('test', 0x9747b28c)).toBe(0x704b81dc);
    expect(murmur3('Hello, world!', 0)).toBe(0xc0363e43);
    expect(murmur3('Hello, world!', 0x9747b28c)).toBe(0x24884cba);
    expect(murmur3('The quick brown fox jumps over the lazy dog', 0)).toBe(0x2e4ff723);
    expect(murmur3('The quick brown fox jumps over the lazy dog', 0x9747b28c)).toBe(0x2fa826cd);
  });

  test('gives numbers from 0 to just below 1, evenly', () => {
    const bins = new Array<number>(10).fill(0);
    for (let n = 0; n < 20_000; n++) {
      // Anything outside [0, 1) would fall into a bin that is not there and make the sum NaN.
      bins[Math.floor(uniform('seed', 'name', 'scope', n, 0) * 10)]!++;
    }
    expect(bins.length).toBe(10);
    expect(chiSquare(bins, new Array(10).fill(2000))).toBeLessThan(CRITICAL_999[9]!);
  });
});

describe('sentence 12: when a draw gets a new value', () => {
  const NOTE = 'rules:\n  mark:\n    when: lap begins\n    do: note\n';
  const laps = (stage: Stage): Stage => stage.to(4, 10);

  test('as its lap begins', () => {
    expect(drawn(`draws:\n  d: left or right, every lap\n${NOTE}`, laps).length).toBe(4);
  });
  test('as its phase begins', () => {
    const phases = 'phases:\n  one: for 1 lap\n  two: for 1 lap\n  three: to the end\n';
    expect(drawn(`draws:\n  d: 1 to 9, every phase\n${phases}${NOTE}`, laps).length).toBe(3);
  });
  test('as its session begins', () => {
    expect(drawn(`draws:\n  d: 1 to 9, every session\n${NOTE}`, laps).length).toBe(1);
  });
  test('as its visit begins', () => {
    const zone = 'places:\n  zone: 85 to 95 cm\n';
    const stage = new Stage(`${zone}draws:\n  d: 1 to 3 s, every visit to zone\n${NOTE}`);
    stage.to(1, 50);
    expect(stage.of('drawn')).toEqual([]);
    stage.to(1, 90).to(1, 50).to(1, 90).to(2, 100);
    expect(stage.of('drawn').map((d) => d.lap)).toEqual([1, 1, 2]);
  });
  test('at the instant after the firing that it names, the first at the start', () => {
    const stage = new Stage(`
draws:
  d: 1 to 1000, every firing of go_on
rules:
  go_on:
    when: lick
    do: note
`);
    stage.begin().wait(1000).lick();
    expect(stage.of('drawn').map((d) => d.ms)).toEqual([0]);
    stage.frame(0);
    expect(stage.of('drawn').map((d) => d.ms)).toEqual([0, 1020]);
  });
  test('a firing that the board refused uses no value', () => {
    const stage = new Stage(`
draws:
  d: 1 to 1000, every firing of water
rules:
  water:
    when: lick
    do: give 4 uL
`);
    stage.outcome = 'later';
    stage.lick().wait(100);
    expect(stage.of('drawn').length).toBe(2);
    const [first, second] = stage.of('drawn').map((d) => d.value);
    stage.settle(stage.requests[0]!, 'not fired');
    stage.wait(10);
    // The first value is in force again; after it is used, the second comes, not a third.
    stage.outcome = 'fired';
    stage.wait(500).lick().wait(50);
    expect(stage.of('drawn').map((d) => d.value)).toEqual([first, second, second]);
  });
});

describe('what a draw gives', () => {
  test('the same seed gives the same values, another seed others', () => {
    const draw = 'left or right, EVERY';
    expect(perFiring(draw, 50)).toEqual(perFiring(draw, 50));
    expect(perFiring(draw, 50)).not.toEqual(perFiring(draw, 50, 'another'));
  });

  test('options by weight, as often as the weights say', () => {
    const values = perFiring('20 or 60 or 140 cm, EVERY, weighted 2 to 1 to 1', 4000);
    const counts = [20, 60, 140].map((cm) => values.filter((v) => v === cm).length);
    const whole = counts.reduce((sum, n) => sum + n, 0);
    expect(whole).toBe(values.length);
    const statistic = chiSquare(counts, [whole / 2, whole / 4, whole / 4]);
    expect(statistic).toBeLessThan(CRITICAL_999[2]!);
  });

  test('shuffled in blocks, every block holds each option as often as its weight says', () => {
    fc.assert(
      fc.property(fc.string(), fc.constantFrom(10, 20, 40), (seed, size) => {
        const values = perFiring(`stim or sham, EVERY, in shuffled blocks of ${size}`, 120, seed);
        for (let at = 0; at + size <= values.length; at += size) {
          const block = values.slice(at, at + size);
          expect(block.filter((v) => v === 'stim').length).toBe(size / 2);
        }
      }),
      { seed: 1, numRuns: 20 },
    );
  });

  test('in a block every order is as likely as any other', () => {
    // Blocks of two: the first of each pair is either, half the time.
    const pairs = perFiring('stim or sham, EVERY, in shuffled blocks of 2', 4000);
    const firsts = pairs.filter((_, n) => n % 2 === 0);
    const stim = firsts.filter((v) => v === 'stim').length;
    const half = firsts.length / 2;
    expect(chiSquare([stim, firsts.length - stim], [half, half])).toBeLessThan(CRITICAL_999[1]!);
  });

  test('at most so many in a row, over the borders of blocks too', () => {
    fc.assert(
      fc.property(fc.string(), fc.integer({ min: 1, max: 3 }), (seed, most) => {
        for (const blocks of ['', ', in shuffled blocks of 10']) {
          const draw = `stim or sham, EVERY${blocks}, at most ${most} in a row`;
          expect(longestRun(perFiring(draw, 150, seed))).toBeLessThanOrEqual(most);
        }
      }),
      { seed: 2, numRuns: 20 },
    );
  });

  test('a tight run in a long block is found, and the block still balances', () => {
    const values = perFiring(
      'stim or sham, EVERY, in shuffled blocks of 100, at most 1 in a row',
      199,
    );
    expect(longestRun(values)).toBe(1);
    expect(values.slice(0, 100).filter((v) => v === 'stim').length).toBe(50);
  });

  test('between bounds, evenly and inside them', () => {
    const values = perFiring('20 to 160 cm, EVERY', 4000).map(Number);
    const bins = new Array<number>(10).fill(0);
    for (const v of values) {
      expect(v >= 20 && v <= 160).toBe(true);
      bins[Math.min(9, Math.floor((v - 20) / 14))]!++;
    }
    const even = new Array(10).fill(values.length / 10);
    expect(chiSquare(bins, even)).toBeLessThan(CRITICAL_999[9]!);
  });

  test('in steps: each step as likely as any other', () => {
    const values = perFiring('20 to 180 mm, EVERY, in steps of 10 mm', 3400).map(Number);
    const steps = Array.from({ length: 17 }, (_, n) => 2 + n);
    const counts = steps.map((cm) => values.filter((v) => v === cm).length);
    expect(counts.reduce((sum, n) => sum + n, 0)).toBe(values.length);
    const even = new Array(17).fill(values.length / 17);
    expect(chiSquare(counts, even)).toBeLessThan(CRITICAL_999[16]!);
  });

  test('at least so far from the last, the shorter way round the belt', () => {
    fc.assert(
      fc.property(fc.string(), fc.integer({ min: 1, max: 60 }), (seed, least) => {
        const draw = `0 to 179 cm, EVERY, at least ${least} cm from the last`;
        const values = perFiring(draw, 60, seed).map(Number);
        for (let n = 1; n < values.length; n++) {
          const apart = Math.abs(values[n]! - values[n - 1]!);
          expect(Math.min(apart, 180 - apart)).toBeGreaterThanOrEqual(least - 1e-9);
        }
      }),
      { seed: 3, numRuns: 30 },
    );
  });

  test('a time is not on the belt: far from the last is far on the line', () => {
    const values = perFiring('1 to 10 s, EVERY, at least 4 s from the last', 300).map(Number);
    for (let n = 1; n < values.length; n++) {
      expect(Math.abs(values[n]! - values[n - 1]!)).toBeGreaterThanOrEqual(4e6);
    }
    expect(values.every((v) => Number.isInteger(v) && v >= 1e6 && v <= 1e7)).toBe(true);
  });

  test('a new phase starts a new block, and what had not been used is drawn again from it', () => {
    const stage = new Stage(`
draws:
  kind: stim or sham, every firing of go_on, in shuffled blocks of 10
phases:
  one: until licks this session >= 3
  two: to the end
rules:
  go_on:
    when: lick
    do: note
  saw:
    when: lick
    if: kind is stim and phase is two
    do: note
`);
    stage.begin().lick(3).wait(100);
    for (let n = 0; n < 20; n++) stage.lick().wait(50);
    // Ten firings of phase two are one whole block: five of each.
    const inTwo = stage
      .firings('go_on')
      .slice(3)
      .map((d) => d.ms);
    const stims = new Set(stage.times('saw'));
    expect(inTwo.slice(0, 10).filter((ms) => stims.has(ms)).length).toBe(5);
    expect(inTwo.slice(10, 20).filter((ms) => stims.has(ms)).length).toBe(5);
  });

  test('changing one draw leaves the others alone', () => {
    const rules = (first: string): string => `
draws:
  here: ${first}
  there: 20 to 160 cm, every lap, at least 40 cm from the last
rules:
  mark:
    when: lap begins
    chance: 50 %
    do: note
`;
    const run = (text: string): { there: unknown[]; marks: number[] } => {
      const stage = new Stage(text).to(20, 0, 60);
      const there = stage.of('drawn').filter((d) => d.name === 'there');
      return { there: there.map((d) => d.value), marks: stage.laps('mark') };
    };
    const before = run(rules('left or right, every lap'));
    const after = run(rules('1 to 3 s, every session'));
    expect(after).toEqual(before);
    expect(before.marks.length).toBeGreaterThan(2);
  });
});

function longestRun(values: readonly unknown[]): number {
  let longest = 0;
  let run = 0;
  values.forEach((value, n) => {
    run = n > 0 && value === values[n - 1] ? run + 1 : 1;
    longest = Math.max(longest, run);
  });
  return longest;
}
