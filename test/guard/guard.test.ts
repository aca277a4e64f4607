import { describe, expect, it } from 'vitest';
import { Guard, IN_SLOT } from '../../server/guard/guard.js';
import { drop, LASER, pulse, RIG, SYNC, VALVE } from './orders.js';

const S = 1_000_000;

/** Asks, reserves and settles a pulse at once; @returns why not, if not. */
function give(guard: Guard, id: number, order: ReturnType<typeof pulse>, nowUs: number) {
  const reason = guard.check([order], nowUs);
  if (reason !== undefined) return reason;
  const onUs = order.widthUs * order.repeats;
  guard.reserve(id, order, nowUs);
  guard.settle(id, 'done', onUs, nowUs + onUs);
  return undefined;
}

describe('an output', () => {
  it('is not on for longer than its longest', () => {
    const guard = new Guard(RIG);
    expect(guard.check([pulse(LASER, 500_000)], 0)).toBeUndefined();
    expect(guard.check([pulse(LASER, 500_001)], 0)).toBe(
      'laser: on for 500.001 ms asked, 500 ms is its longest',
    );
  });

  it('rests for its least gap after a fall, and within a train', () => {
    const guard = new Guard(RIG);
    give(guard, 1, pulse(LASER, 10_000), 0);
    expect(guard.check([pulse(LASER, 10_000)], 29_999)).toBe(
      'laser: 19.999 ms after its last pulse, 20 ms is its least gap',
    );
    expect(guard.check([pulse(LASER, 10_000)], 30_000)).toBeUndefined();
    const train = { repeats: 3, periodUs: 25_000 };
    expect(guard.check([pulse(LASER, 5001, train)], S)).toBe(
      'laser: 19.999 ms between pulses asked, 20 ms is its least gap',
    );
    expect(guard.check([pulse(LASER, 5000, train)], S)).toBeUndefined();
  });

  it('does one thing at a time: busy until a firing on its way can no longer run', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, pulse(LASER, 10_000), 0, 50_000);
    expect(guard.check([pulse(LASER, 1000)], 79_999)).toBe('laser: busy with an earlier firing');
    expect(guard.check([pulse(LASER, 1000)], 80_000)).toBeUndefined();
    // Once the rise is known, so is the end.
    guard.fired(1, 5000);
    expect(guard.check([pulse(LASER, 1000)], 34_999)).toBe('laser: busy with an earlier firing');
    expect(guard.check([pulse(LASER, 1000)], 35_000)).toBeUndefined();
  });

  it('is not kept busy by a slot that waits, whose collision the board refuses', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, pulse(LASER, 10_000), 0, IN_SLOT);
    expect(guard.check([pulse(LASER, 1000)], 5000)).toBeUndefined();
    guard.fired(1, 4000);
    expect(guard.check([pulse(LASER, 1000)], 5000)).toBe('laser: busy with an earlier firing');
  });

  it('pulses so often in a session and no more, a train counting by its rises', () => {
    const guard = new Guard(RIG);
    const train = pulse(LASER, 100, { repeats: 40, periodUs: 30_000 });
    expect(give(guard, 1, train, 0)).toBeUndefined();
    expect(give(guard, 2, train, 60 * S)).toBeUndefined();
    expect(give(guard, 3, train, 120 * S)).toBe(
      'laser: 40 pulses asked, 20 left of 100 for the session',
    );
    expect(give(guard, 4, pulse(LASER, 100, { repeats: 20, periodUs: 30_000 }), 120 * S)).toBe(
      undefined,
    );
    expect(guard.check([pulse(LASER, 100)], 180 * S)).toBe(
      'laser: 1 pulse asked, 0 left of 100 for the session',
    );
  });

  it('that the rig file does not name is never agreed to', () => {
    const guard = new Guard(RIG);
    expect(guard.check([pulse(7, 1000)], 0)).toBe('output 7: not in the rig file');
    expect(() => guard.reserve(1, pulse(7, 1000), 0)).toThrow(RangeError);
  });

  it('is not asked for what is no pulse', () => {
    const guard = new Guard(RIG);
    for (const order of [
      pulse(LASER, 0),
      pulse(LASER, -5),
      pulse(LASER, 10.5),
      pulse(LASER, Number.NaN),
      pulse(LASER, 100, { repeats: 0 }),
      pulse(LASER, 100, { repeats: 1.5, periodUs: 50_000 }),
      pulse(LASER, 100, { repeats: 2, periodUs: Number.POSITIVE_INFINITY }),
    ]) {
      expect(guard.check([order], 0)).toMatch(/^laser: (not a pulse|on for)/);
    }
  });
});

describe('duty', () => {
  it('is exact to the microsecond in any window, wherever it lies', () => {
    const guard = new Guard(RIG);
    // 1 s of on-time in any 10 s.
    give(guard, 1, pulse(LASER, 500_000), 0);
    give(guard, 2, pulse(LASER, 400_000), 2 * S);
    expect(guard.check([pulse(LASER, 100_001)], 5 * S)).toBe(
      'laser: on for 100.001 ms asked, 100 ms left of 1 s in any 10 s',
    );
    expect(guard.check([pulse(LASER, 100_000)], 5 * S)).toBeUndefined();
    // A window of 10 s that ends with 300 ms from 9.9 s on begins at 0.2 s, with 300 ms of pulse 1.
    expect(guard.check([pulse(LASER, 300_000)], 9_900_000)).toBeUndefined();
    expect(guard.check([pulse(LASER, 300_000)], 9_899_999)).toMatch(/299.999 ms left/);
  });

  it('counts a train by the pulses of it that lie in the window', () => {
    const guard = new Guard(RIG);
    // 10 pulses of 100 ms, one a second, from 0 to 9.1 s: all of what is allowed.
    const train = pulse(LASER, 100_000, { repeats: 10, periodUs: S });
    guard.reserve(1, train, 0);
    guard.fired(1, 0);
    guard.settle(1, 'done', 1_000_000, 9_100_000);
    expect(guard.check([pulse(LASER, 100_000)], 9_999_999)).toMatch(/99.999 ms left/);
    expect(guard.check([pulse(LASER, 100_000)], 10 * S)).toBeUndefined();
    expect(guard.check([pulse(LASER, 200_000)], 10_500_000)).toMatch(/100 ms left/);
    expect(guard.check([pulse(LASER, 200_000)], 11 * S)).toBeUndefined();
  });

  it('counts everything armed as if it ran now', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, pulse(LASER, 500_000), 0, IN_SLOT);
    guard.reserve(2, pulse(LASER, 400_000), 0, IN_SLOT);
    expect(guard.check([pulse(LASER, 100_001)], 60 * S, IN_SLOT)).toMatch(/100 ms left/);
    guard.release(1);
    expect(guard.check([pulse(LASER, 500_000)], 60 * S, IN_SLOT)).toBeUndefined();
  });

  it('never counts too little when more firings lie in the window than are kept apart', () => {
    const guard = new Guard({
      ...RIG,
      outputs: [
        {
          ...RIG.outputs[LASER]!,
          perSession: 1_000_000,
          leastGapUs: 0,
          duty: { share: 0.5, windowUs: 100 * S },
        },
      ],
    });
    const ends: number[] = [];
    let id = 0;
    for (let us = 0; us < 300 * S; us += 20_000) {
      if (give(guard, ++id, pulse(LASER, 11_000), us) === undefined) ends.push(us + 11_000);
      let onUs = 0;
      for (let i = ends.length - 1; i >= 0 && ends[i]! > us + 11_000 - 100 * S; i--) {
        onUs += Math.min(11_000, ends[i]! - (us + 11_000 - 100 * S));
      }
      expect(onUs).toBeLessThanOrEqual(50 * S);
    }
    // And not much too much: in 300 s, 150 s of on-time would be exact.
    expect(ends.length * 11_000).toBeGreaterThan(130 * S);
  });
});

describe('water', () => {
  it('is charged by what the board measured, from the calibrated line', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, drop(4000), 0);
    expect(guard.waterReservedNl).toBe(4000);
    guard.settle(1, 'done', 48_100, 60_000);
    expect(guard.waterReservedNl).toBe(0);
    expect(guard.waterGivenNl).toBe(4010);
  });

  it('stops at the session limit, saying what is left', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, perSessionNl: 10_000 } });
    give(guard, 1, drop(4000), 0);
    give(guard, 2, drop(4000), S);
    expect(guard.check([drop(3000)], 2 * S)).toBe(
      'valve: 3 uL asked, 2 uL left of 10 uL for the session',
    );
    expect(guard.check([drop(2000)], 2 * S)).toBeUndefined();
    expect(guard.waterLeftNl).toBe(2000);
  });

  it('stops at the day limit, with what was given earlier today', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, givenTodayNl: 1_497_000 } });
    expect(guard.check([drop(4000)], 0)).toBe('valve: 4 uL asked, 3 uL left of 1.5 mL for the day');
  });

  it('comes in drops no larger than the largest, and within the calibrated range', () => {
    const guard = new Guard(RIG);
    expect(guard.check([drop(11_000)], 0)).toBe('valve: a drop of 11 uL asked, 10 uL is the most');
    expect(guard.check([drop(500)], 0)).toBe(
      'valve: 0.5 uL asked, the valve was calibrated for 1 uL to 12 uL',
    );
  });

  it('is charged by on-time when the order names no volume', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, pulse(VALVE, 28_000), 0);
    expect(guard.waterReservedNl).toBe(2000);
  });

  it('of a drop never accounted for is a range, and is charged for good', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, perSessionNl: 10_000 } });
    guard.reserve(1, drop(8000), 0);
    guard.settle(1, 'uncertain', 0, S);
    expect([guard.waterGivenNl, guard.waterUncertainNl, guard.waterReservedNl]).toEqual([
      0, 8000, 0,
    ]);
    expect(guard.check([drop(3000)], 1000 * S)).toMatch(/2 uL left/);
    // Its outcome will not change that, nor will a second settlement.
    expect(guard.release(1)).toBe(false);
    expect(guard.settle(1, 'done', 88_000, 2 * S)).toBe(false);
    expect(guard.waterUncertainNl).toBe(8000);
  });

  it('flushed by hand is charged too', () => {
    const guard = new Guard(RIG);
    guard.charge(VALVE, 208_000, S);
    expect(guard.waterGivenNl).toBe(20_000);
    expect(guard.check([drop(4000)], S + 99_999)).toMatch(/its least gap/);
  });
});

describe('an id', () => {
  it('that did not fire gives everything back', () => {
    const guard = new Guard(RIG);
    for (let id = 1; id <= 1000; id++) {
      expect(guard.check([drop(4000)], id * S)).toBeUndefined();
      guard.reserve(id, drop(4000), id * S);
      expect(guard.release(id)).toBe(true);
    }
    expect(guard.waterLeftNl).toBe(1_000_000);
    expect([...guard.unsettledIds]).toEqual([]);
  });

  it('is charged to every limit when nobody can say what became of it', () => {
    const guard = new Guard(RIG);
    const train = pulse(LASER, 5000, { repeats: 98, periodUs: 50_000 });
    guard.reserve(1, train, 0, IN_SLOT);
    guard.settle(1, 'uncertain', 0, 20 * S);
    expect(guard.check([pulse(LASER, 1000)], 20 * S)).toMatch(/its least gap/);
    // 490 ms of on-time may have been the last thing before 20 s.
    expect(guard.check([pulse(LASER, 500_000)], 21 * S)).toBeUndefined();
    guard.reserve(2, pulse(LASER, 500_000), 21 * S);
    expect(guard.check([pulse(LASER, 20_000)], 25 * S)).toMatch(/10 ms left of 1 s/);
    guard.release(2);
    expect(guard.check([pulse(LASER, 1000, { repeats: 3, periodUs: 50_000 })], 99 * S)).toBe(
      'laser: 3 pulses asked, 2 left of 100 for the session',
    );
  });

  it('that was cut short is charged for what ran', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, pulse(LASER, 5000, { repeats: 90, periodUs: 50_000 }), 0);
    guard.fired(1, 0);
    guard.settle(1, 'done', 22_000, 202_000);
    expect(guard.check([pulse(LASER, 1000, { repeats: 95, periodUs: 50_000 })], S)).toBeUndefined();
    expect(guard.check([pulse(LASER, 1000, { repeats: 96, periodUs: 50_000 })], S)).toMatch(
      /95 left of 100/,
    );
  });

  it('of a sham counts for the limits as if real, and gives no water', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, perSessionNl: 10_000 } });
    guard.reserve(1, drop(8000), 0);
    guard.settle(1, 'sham', 0, 0);
    expect(guard.waterGivenNl).toBe(0);
    expect(guard.waterUncertainNl).toBe(0);
    expect(guard.check([drop(2000)], 100_000)).toMatch(/its least gap/);
    expect(guard.check([drop(3000)], S)).toMatch(/2 uL left/);
  });

  it('is reserved once, and settled or released once', () => {
    const guard = new Guard(RIG);
    guard.reserve(1, drop(4000), 0);
    expect(() => guard.reserve(1, drop(4000), S)).toThrow(RangeError);
    expect(guard.settle(1, 'done', 48_000, 48_000)).toBe(true);
    expect(guard.settle(1, 'done', 48_000, 48_000)).toBe(false);
    expect(guard.fired(1, 0)).toBe(false);
    expect(guard.waterGivenNl).toBe(4000);
  });
});

describe('a firing of several orders', () => {
  it('is agreed to as a whole or not at all, and asking charges nothing', () => {
    const guard = new Guard(RIG);
    const both = [drop(4000), pulse(LASER, 600_000)];
    expect(guard.check(both, 0)).toMatch(/^laser: on for/);
    expect(guard.check([drop(4000), pulse(LASER, 100_000)], 0)).toBeUndefined();
    expect(guard.waterReservedNl).toBe(0);
    for (let i = 0; i < 1000; i++) guard.check([drop(10_000), pulse(LASER, 500_000)], 0);
    expect(guard.check([drop(10_000), pulse(LASER, 500_000)], 0)).toBeUndefined();
  });

  it('is checked with its own earlier orders in place', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, perSessionNl: 10_000 } });
    const later = { ...drop(6000), delayUs: S };
    expect(guard.check([drop(6000)], 0)).toBeUndefined();
    expect(guard.check([drop(6000), later], 0)).toBe(
      'valve: 12 uL asked, 10 uL left of 10 uL for the session',
    );
    expect(guard.check([pulse(LASER, 10_000), pulse(LASER, 10_000)], 0)).toMatch(/busy/);
    expect(
      guard.check([pulse(LASER, 10_000), pulse(LASER, 10_000, { delayUs: 30_000 })], 0),
    ).toBeUndefined();
  });

  it('is never held back by a mark: one that cannot be done is left out', () => {
    const guard = new Guard(RIG);
    const orders = [pulse(SYNC, 10_000), drop(4000), pulse(SYNC, 10_000)];
    expect(guard.check(orders, 0)).toBeUndefined();
    expect(guard.leftOut).toEqual([2]);
    expect(guard.check([pulse(SYNC, 200_000), drop(4000)], 0)).toBeUndefined();
    expect(guard.leftOut).toEqual([0]);
    expect(guard.check([drop(4000), pulse(SYNC, 10_000)], 0)).toBeUndefined();
    expect(guard.leftOut).toEqual([]);
  });
});

describe('a hold', () => {
  it('stops its kind of output and nothing else', () => {
    const guard = new Guard(RIG);
    guard.hold('stimulus', 'by keyboard');
    expect(guard.check([pulse(LASER, 1000)], 0)).toBe('laser: stimulus is held: by keyboard');
    expect(guard.check([drop(4000), pulse(SYNC, 1000)], 0)).toBeUndefined();
    guard.hold('water', 'the record cannot be written');
    expect(guard.check([drop(4000)], 0)).toBe('valve: water is held: the record cannot be written');
    expect(guard.heldBecause('water')).toBe('the record cannot be written');
    guard.unhold('stimulus');
    guard.unhold('water');
    expect(guard.check([drop(4000), pulse(LASER, 1000)], 0)).toBeUndefined();
    expect(guard.leftOut).toEqual([]);
  });
});

describe('what the board is set to', () => {
  it('is what is left: of rises, of on-time, and of water as on-time', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, perSessionNl: 100_000 } });
    give(guard, 1, pulse(LASER, 1000, { repeats: 60, periodUs: 50_000 }), 0);
    give(guard, 2, drop(4000), 0);
    guard.reserve(3, drop(6000), S);
    guard.settle(3, 'uncertain', 0, 2 * S);
    const [valve, laser, sync] = guard.allowances();
    // 90 uL left at 10 us a nanolitre, in 90 drops of 1 uL at most, 8.02 ms for each.
    expect(valve).toEqual({
      output: VALVE,
      longestOnUs: 250_000,
      leastGapUs: 100_000,
      allowanceUs: 900_000 + 90 * 8020,
      allowanceRises: 90,
      leastCounts: 0,
    });
    expect(laser).toMatchObject({ allowanceRises: 40, allowanceUs: 40 * 500_020 });
    expect(sync).toMatchObject({ allowanceRises: 0xffff, allowanceUs: 0xffff_ffff });
  });

  it('is nothing once a limit is used up', () => {
    const guard = new Guard({ ...RIG, water: { ...RIG.water, givenTodayNl: 2_000_000 } });
    expect(guard.allowances()[VALVE]).toMatchObject({ allowanceUs: 0, allowanceRises: 0 });
  });
});
