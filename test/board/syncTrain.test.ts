import { describe, expect, test } from 'vitest';
import type { Sync } from '../../server/wire/messages.js';
import { TestHost } from './testHost.js';

const TRAIN: Sync = {
  output: 3,
  running: 1,
  widthUs: 10_000,
  leastGapUs: 100_000,
  mostGapUs: 200_000,
  seed: 1,
};
/** The gaps of seed 1 between 100 and 200 ms, as the wire page gives them. */
const GAPS = [100_006, 101_574, 161_641, 107_161];

function withTrain(changes: Partial<Sync> = {}): TestHost {
  const host = TestHost.connected();
  host.configure({ output: 3, longestOnUs: 20_000, leastGapUs: 1000 });
  host.send('sync', { ...TRAIN, ...changes });
  return host;
}

describe('a sync train', () => {
  test('rises at the times that the wire page foretells', () => {
    const host = withTrain();
    host.live(600_000);
    let us = 0;
    const foretold = GAPS.map((gap) => {
      us += gap;
      const pulse = [us, us + 10_000];
      us += 10_000;
      return pulse;
    });
    expect(host.pulses(3)).toEqual(foretold);
  });

  test('is told edge by edge', () => {
    const host = withTrain();
    host.live(120_000);
    expect(host.edges.map((edge) => [edge.input, edge.level, edge.boardUs])).toEqual([
      [0x83, 1, 100_006],
      [0x83, 0, 110_006],
    ]);
    expect(host.outcomes).toEqual([]);
  });

  test('goes on when the host falls silent, and under the next tag', () => {
    const host = withTrain();
    host.silent(3_000_000);
    host.identify(0x99);
    host.live(3_000_000);
    const rises = host.pulses(3).map(([rise]) => rise);
    const gaps = rises.slice(1).map((rise, n) => rise - rises[n]!);
    expect(Math.min(...gaps)).toBeGreaterThanOrEqual(110_000);
    expect(Math.max(...gaps)).toBeLessThanOrEqual(210_000);
    expect(rises.at(-1)).toBeGreaterThan(5_700_000);
    expect(
      host.pulses(3).every(([rise, fall]) => fall === undefined || fall - rise === 10_000),
    ).toBe(true);
  });

  test('owns its output', () => {
    const host = withTrain();
    expect(host.told(host.pulse({ output: 3 }))).toEqual(['refused busy']);
  });

  test.each([
    ['stopped', (host: TestHost) => host.send('sync', { ...TRAIN, running: 0 })],
    ['made quiet', (host: TestHost) => host.send('quiet', { outputs: 8 })],
    ['no longer allowed', (host: TestHost) => host.configure({ output: 3, longestOnUs: 9999 })],
    ['reset', (host: TestHost) => host.board.reset()],
  ])('ends when it is %s', (_, end) => {
    const host = withTrain();
    host.live(105_000);
    end(host);
    host.silent(1_000_000);
    expect(host.pulses(3)).toEqual([[100_006, 105_000]]);
  });

  test('begins afresh when it is begun again', () => {
    const host = withTrain();
    host.live(50_000);
    host.send('sync', TRAIN);
    host.live(120_000);
    expect(host.pulses(3)[0]![0]).toBe(50_000 + GAPS[0]!);
  });

  test.each([
    ['no such output', { output: 99 }],
    ['an output that is not configured', { output: 5 }],
    ['a pulse wider than allowed', { widthUs: 20_001 }],
    ['no width', { widthUs: 0 }],
    ['gaps below the least gap', { leastGapUs: 999 }],
    ['gaps that end before they begin', { mostGapUs: 99_999 }],
  ])('is refused with %s', (_, changes) => {
    const host = withTrain(changes);
    host.live(500_000);
    expect(host.faultNames()).toEqual(['syncRefused']);
    expect(host.changes).toEqual([]);
  });

  test('is refused on an output that is in use, which it leaves alone', () => {
    const host = TestHost.connected();
    const id = host.pulse();
    host.send('sync', { ...TRAIN, output: 0 });
    host.live(20_000);
    expect(host.faultNames()).toEqual(['syncRefused']);
    expect(host.told(id)).toEqual(['fired', 'done']);
  });
});
