import { describe, expect, test } from 'vitest';
import { PULSE_FLAG } from '../../server/wire/messages.js';
import { TestHost } from './testHost.js';

const { startAt, countWindow } = PULSE_FLAG;

describe('a pulse', () => {
  test('rises at once, falls after its width, and both are told', () => {
    const host = TestHost.connected();
    host.live(100_000);
    host.board.move(40);
    const id = host.pulse({ widthUs: 3000 });
    host.live(20_000);
    expect(host.pulses()).toEqual([[100_000, 103_000]]);
    expect(host.told(id)).toEqual(['fired', 'done']);
    expect(host.outcome(id, 'fired')).toMatchObject({ boardUs: 100_000, count: 40, onUs: 0 });
    expect(host.outcome(id, 'done')).toMatchObject({ boardUs: 103_000, count: 40, onUs: 3000 });
  });

  test('rises at the board time that it names', () => {
    const host = TestHost.connected();
    const id = host.pulse({ flags: startAt, startUs: 12_345, expiryUs: 20_000 });
    host.live(50_000);
    expect(host.pulses()).toEqual([[12_345, 22_345]]);
    expect(host.told(id)).toEqual(['fired', 'done']);
  });

  test('whose start is past rises now', () => {
    const host = TestHost.connected();
    host.live(10_000);
    host.pulse({ flags: startAt, startUs: 9000, expiryUs: 20_000 });
    host.live(20_000);
    expect(host.pulses()).toEqual([[10_000, 20_000]]);
  });

  test('of a train keeps width and period exactly', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 2000, periodUs: 7000, repeats: 4 });
    host.live(60_000);
    expect(host.pulses()).toEqual([
      [0, 2000],
      [7000, 9000],
      [14_000, 16_000],
      [21_000, 23_000],
    ]);
    expect(host.told(id)).toEqual(['fired', 'done']);
    expect(host.outcome(id, 'done')).toMatchObject({ boardUs: 23_000, onUs: 8000 });
  });

  test('waits its turn to the microsecond: a fall comes before a rise at the same time', () => {
    const host = TestHost.connected();
    host.pulse({ widthUs: 5000 });
    host.pulse({ flags: startAt, startUs: 5000 });
    host.live(50_000);
    expect(host.pulses()).toEqual([
      [0, 5000],
      [5000, 15_000],
    ]);
  });

  test('is expired when its cause is older than the window, and not a microsecond before', () => {
    const host = TestHost.connected();
    host.live(100_000);
    const late = host.pulse({ expiryUs: 99_999 });
    const just = host.pulse({ expiryUs: 100_000 });
    host.live(1000);
    expect(host.told(late)).toEqual(['expired']);
    expect(host.told(just)).toEqual(['fired']);
  });

  test('is refused when its expiry is 10 s ahead or more, or before its start', () => {
    const host = TestHost.connected();
    expect(host.told(host.pulse({ expiryUs: 10_000_000 }))).toEqual(['refused badExpiry']);
    expect(host.told(host.pulse({ expiryUs: 9_999_999 }))).toEqual(['fired']);
    const id = host.pulse({ output: 1, flags: startAt, startUs: 3000, expiryUs: 2999 });
    expect(host.told(id)).toEqual(['refused badExpiry']);
  });

  test('keeps its start and expiry over the wrap of board time', () => {
    const host = TestHost.connected({ startUs: 2 ** 32 - 10_000 });
    const id = host.pulse({
      flags: startAt,
      startUs: 2 ** 32 + 5000,
      expiryUs: 2 ** 32 + 6000,
      widthUs: 2000,
    });
    const late = host.pulse({ output: 1, expiryUs: 2 ** 32 - 10_001 });
    host.live(40_000);
    expect(host.told(late)).toEqual(['expired']);
    expect(host.told(id)).toEqual(['fired', 'done']);
    expect(host.outcome(id, 'fired').boardUs).toBe(5000);
    expect(host.pulses()).toEqual([[15_000, 17_000]]);
  });

  test.each([
    [-5, 5, 'fired'],
    [0, 0, 'fired'],
    [1, 9, 'refused countWindow'],
    [-9, -1, 'refused countWindow'],
    [5, -5, 'refused countWindow'],
  ])('with the window %i to %i at count 0 is %s', (countFrom, countTo, told) => {
    const host = TestHost.connected();
    const id = host.pulse({ flags: countWindow, countFrom, countTo });
    expect(host.told(id)).toEqual([told]);
  });

  test('looks at the count window when it rises, not when it comes', () => {
    const host = TestHost.connected();
    const flags = countWindow | startAt;
    const window = { flags, countFrom: 10, countTo: 20 };
    const first = host.pulse({ ...window, startUs: 5000 });
    const second = host.pulse({ ...window, startUs: 20_000 });
    host.silent(1000);
    host.board.move(15);
    host.silent(10_000);
    host.board.move(6);
    host.silent(10_000);
    expect(host.told(first)).toEqual(['fired', 'done']);
    expect(host.told(second)).toEqual(['refused countWindow']);
  });

  test('has a window that reaches over the wrap of the count', () => {
    const host = TestHost.connected({ startCount: 2 ** 31 - 1 });
    host.board.move(3);
    const flags = countWindow;
    const inside = host.pulse({ flags, countFrom: 2 ** 31 - 5, countTo: -(2 ** 31) + 5 });
    expect(host.told(inside)).toEqual(['fired']);
  });

  test.each([
    ['id 0', { id: 0 }],
    ['no such output', { output: 8 }],
    ['no width', { widthUs: 0 }],
    ['no repeats', { repeats: 0 }],
    ['a period not above the width', { repeats: 2, periodUs: 10_000 }],
  ])('is refused for %s', (_, changes) => {
    const host = TestHost.connected();
    expect(host.told(host.pulse(changes))).toEqual(['refused badShape']);
    host.live(50_000);
    expect(host.changes).toEqual([]);
  });

  test('has no place to wait when all are taken', () => {
    const host = TestHost.connected({ waiting: 8 });
    const ids = Array.from({ length: 9 }, (_, n) =>
      host.pulse({ flags: startAt, startUs: 1000 + n * 3000, widthUs: 1000 }),
    );
    host.live(60_000);
    expect(host.told(ids[7]!)).toEqual(['fired', 'done']);
    expect(host.told(ids[8]!)).toEqual(['refused busy']);
    expect(host.faults).toMatchObject([{ fault: 3, detail: ids[8] }]);
  });
});

describe('an output', () => {
  test('that was never configured is never on', () => {
    const host = TestHost.connected();
    const now = host.pulse({ output: 2 });
    const armed = host.arm({ output: 2, count: 5 });
    host.board.move(10);
    expect(host.told(now)).toEqual(['refused notConfigured']);
    expect(host.told(armed)).toEqual(['refused notConfigured']);
    expect(host.changes).toEqual([]);
  });

  test('has one owner: a rise while it is on is busy, and while its train pauses, too', () => {
    const host = TestHost.connected();
    const train = host.pulse({ widthUs: 1000, periodUs: 10_000, repeats: 3 });
    host.silent(500);
    const whileOn = host.pulse({ widthUs: 100 });
    host.silent(5000);
    const between = host.pulse({ widthUs: 100 });
    host.live(60_000);
    expect(host.told(whileOn)).toEqual(['refused busy']);
    expect(host.told(between)).toEqual(['refused busy']);
    expect(host.told(train)).toEqual(['fired', 'done']);
    expect(host.pulses()).toHaveLength(3);
  });

  test('refuses what is wider than its longest time on', () => {
    const host = TestHost.connected();
    host.configure({ longestOnUs: 5000 });
    expect(host.told(host.pulse({ widthUs: 5001 }))).toEqual(['refused longestOn']);
    expect(host.told(host.pulse({ widthUs: 5000 }))).toEqual(['fired']);
  });

  test('is cut when its longest time on becomes shorter during a pulse', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 500_000 });
    host.live(30_000);
    host.configure({ longestOnUs: 60_000 });
    host.live(100_000);
    expect(host.pulses()).toEqual([[0, 60_000]]);
    expect(host.told(id)).toEqual(['fired', 'done longestOn']);
  });

  test('is not left on for longer because its longest time on was raised again', () => {
    const host = TestHost.connected();
    host.pulse({ widthUs: 500_000 });
    host.live(30_000);
    host.configure({ longestOnUs: 60_000 });
    host.configure({ longestOnUs: 900_000 });
    host.live(600_000);
    expect(host.pulses()).toEqual([[0, 60_000]]);
  });

  test('falls at once when its longest time on becomes shorter than it has been on', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 500_000 });
    host.live(80_000);
    host.configure({ longestOnUs: 60_000 });
    host.live(10_000);
    expect(host.pulses()).toEqual([[0, 80_000]]);
    expect(host.told(id)).toEqual(['fired', 'done longestOn']);
  });

  test('keeps its least gap, from fall to rise', () => {
    const host = TestHost.connected();
    host.configure({ leastGapUs: 20_000 });
    host.pulse();
    host.silent(29_999);
    const early = host.pulse();
    host.silent(1);
    const right = host.pulse();
    expect(host.told(early)).toEqual(['refused leastGap']);
    expect(host.told(right)).toEqual(['fired']);
  });

  test('keeps its least gap within a train', () => {
    const host = TestHost.connected();
    host.configure({ leastGapUs: 20_000 });
    const close = host.pulse({ repeats: 2, periodUs: 29_999 });
    const wide = host.pulse({ repeats: 2, periodUs: 30_000 });
    expect(host.told(close)).toEqual(['refused leastGap']);
    expect(host.told(wide)).toEqual(['fired']);
  });

  test('keeps its least distance between first rises, whichever way the belt moves', () => {
    const host = TestHost.connected();
    host.configure({ leastCounts: 100 });
    const fire = () => {
      host.live(20_000);
      return host.told(host.pulse({ widthUs: 1000 })).join();
    };
    expect(fire()).toBe('fired');
    host.board.move(99);
    expect(fire()).toBe('refused leastCounts');
    host.board.move(-198);
    expect(fire()).toBe('refused leastCounts');
    host.board.move(-1);
    expect(fire()).toBe('fired');
  });

  test('runs its train on at one place: the least distance is between commands', () => {
    const host = TestHost.connected();
    host.configure({ leastCounts: 100 });
    host.pulse({ widthUs: 1000, periodUs: 5000, repeats: 5 });
    host.live(50_000);
    expect(host.pulses()).toHaveLength(5);
  });

  test('spends its allowance of time, and a new configure brings more', () => {
    const host = TestHost.connected();
    host.configure({ allowanceUs: 25_000 });
    const told = [1, 2, 3].map(() => {
      const id = host.pulse();
      host.live(15_000);
      return host.told(id)[0];
    });
    expect(told).toEqual(['fired', 'fired', 'refused allowance']);
    host.configure({ allowanceUs: 25_000 });
    expect(host.told(host.pulse())).toEqual(['fired']);
  });

  test('spends its allowance of rises, and a train needs all of its own', () => {
    const host = TestHost.connected();
    host.configure({ allowanceRises: 3 });
    const train = { widthUs: 100, periodUs: 1000 };
    expect(host.told(host.pulse({ ...train, repeats: 4 }))).toEqual(['refused allowance']);
    expect(host.told(host.pulse({ ...train, repeats: 3 }))).toEqual(['fired']);
    host.live(10_000);
    expect(host.told(host.pulse())).toEqual(['refused allowance']);
  });

  test('gets back the time of a pulse that was cut short', () => {
    const host = TestHost.connected();
    host.configure({ allowanceUs: 500_000 });
    host.pulse({ widthUs: 500_000 });
    host.live(100_000);
    host.send('quiet', { outputs: 1 });
    expect(host.told(host.pulse({ widthUs: 400_001 }))).toEqual(['refused allowance']);
    expect(host.told(host.pulse({ widthUs: 400_000 }))).toEqual(['fired']);
  });

  test('gets nothing back once it was configured anew: the new allowance is all there is', () => {
    const host = TestHost.connected();
    host.pulse({ widthUs: 500_000 });
    host.live(100_000);
    host.configure({ allowanceUs: 1000 });
    host.send('quiet', { outputs: 1 });
    expect(host.told(host.pulse({ widthUs: 1001 }))).toEqual(['refused allowance']);
    expect(host.told(host.pulse({ widthUs: 1000 }))).toEqual(['fired']);
  });

  test('does not overflow in width times repeats', () => {
    const host = TestHost.connected();
    host.configure({ longestOnUs: 0xffff_ffff, allowanceUs: 1_000_000, allowanceRises: 65_535 });
    const id = host.pulse({ widthUs: 65_538, periodUs: 70_000, repeats: 65_535 });
    expect(host.told(id)).toEqual(['refused allowance']);
  });

  test('ends a train whose further pulses are no longer allowed', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 1000, periodUs: 10_000, repeats: 9 });
    host.live(25_000);
    host.configure({ allowanceRises: 1 });
    host.live(60_000);
    expect(host.pulses()).toHaveLength(4);
    expect(host.told(id)).toEqual(['fired', 'done allowance']);
  });

  test('ends a train between two pulses when they have become too wide', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 5000, periodUs: 20_000, repeats: 9 });
    host.live(10_000);
    host.configure({ longestOnUs: 4999 });
    host.live(60_000);
    expect(host.pulses()).toEqual([[0, 5000]]);
    expect(host.told(id)).toEqual(['fired', 'done longestOn']);
  });

  test('ends a train between two pulses when their gaps have become too short', () => {
    const host = TestHost.connected();
    const id = host.pulse({ widthUs: 5000, periodUs: 20_000, repeats: 9 });
    host.live(10_000);
    host.configure({ leastGapUs: 15_001 });
    host.live(60_000);
    expect(host.pulses()).toEqual([[0, 5000]]);
    expect(host.told(id)).toEqual(['fired', 'done leastGap']);
  });

  test('is quiet when its limits are taken away or its idle level changes', () => {
    for (const change of [{ longestOnUs: 0 }, { flags: 1 }]) {
      const host = TestHost.connected();
      const id = host.pulse();
      host.silent(1000);
      host.configure(change);
      expect(host.told(id)).toEqual(['fired', 'done cut']);
      expect(host.pulses()).toEqual([[0, 1000]]);
    }
  });

  test('is made quiet alone by a mask that names it alone', () => {
    const host = TestHost.connected();
    const ends = host.pulse();
    const waits = host.pulse({ flags: startAt, startUs: 30_000 });
    const armed = host.arm({ count: 9 });
    const stays = host.pulse({ output: 1 });
    host.silent(2000);
    host.send('quiet', { outputs: 1 });
    expect(host.told(ends)).toEqual(['fired', 'done cut']);
    expect(host.told(waits)).toEqual(['disarmed cut']);
    expect(host.told(armed)).toEqual(['disarmed cut']);
    host.live(40_000);
    expect(host.told(stays)).toEqual(['fired', 'done']);
    expect(host.pulses(0)).toEqual([[0, 2000]]);
  });
});
