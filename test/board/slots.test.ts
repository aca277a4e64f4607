import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { TestHost } from './testHost.js';

describe('an armed slot', () => {
  test('fires at its count and at no other, in its direction', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: 100 });
    host.board.move(99);
    host.silent(500);
    expect(host.told(id)).toEqual([]);
    host.board.step(1);
    expect(host.told(id)).toEqual(['fired']);
    expect(host.outcome(id, 'fired')).toMatchObject({ boardUs: 500, count: 100 });
  });

  test('fires in the middle of a move of many counts, at its own count', () => {
    const host = TestHost.connected();
    const up = host.arm({ count: 100 });
    const down = host.arm({ slot: 1, output: 1, rising: 0, count: -60 });
    host.board.move(1000);
    host.board.move(-2000);
    expect(host.outcome(up, 'fired').count).toBe(100);
    expect(host.outcome(down, 'fired').count).toBe(-60);
    expect(host.board.count).toBe(-1000);
  });

  test('does not fire when its count is come to the other way', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: 10 });
    // Behind the target without having been compared: only a fault does that.
    host.board.skipCounts(20);
    host.board.move(-15);
    expect(host.told(id)).toEqual([]);
  });

  test('fires once, however the belt jitters over its count', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: 10, widthUs: 100 });
    host.board.move(10);
    for (let n = 0; n < 20; n++) {
      host.silent(1000);
      host.board.move(n % 2 === 0 ? -1 : 1);
    }
    expect(host.told(id)).toEqual(['fired', 'done']);
  });

  test.each([
    ['up, at the count', 1, 50],
    ['up, behind', 1, 49],
    ['down, at the count', 0, 50],
    ['down, behind', 0, 51],
  ])('is passed when the target is not ahead: %s', (_, rising, count) => {
    const host = TestHost.connected();
    host.board.move(50);
    expect(host.told(host.arm({ rising, count }))).toEqual(['passed']);
  });

  test('is passed within a millisecond when its target was skipped', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: 10 });
    host.board.skipCounts(12);
    host.silent(1000);
    expect(host.told(id)).toEqual(['passed']);
    expect(host.changes).toEqual([]);
  });

  test('still fires at once while another, left behind, waits to be swept', () => {
    const host = TestHost.connected();
    const behind = host.arm({ slot: 0, count: 10 });
    const below = host.arm({ slot: 2, rising: 0, count: -10 });
    const ahead = host.arm({ slot: 1, output: 1, count: 20 });
    host.board.skipCounts(15);
    host.board.move(5);
    expect([host.told(behind), host.told(ahead)]).toEqual([[], ['fired']]);
    host.live(20_000);
    host.board.skipCounts(-35);
    const lower = host.arm({ slot: 1, output: 1, rising: 0, count: -20 });
    host.board.move(-5);
    expect([host.told(below), host.told(lower)]).toEqual([[], ['fired']]);
  });

  test('left behind and come ahead of again before the sweep, fires', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: 10 });
    host.board.skipCounts(20);
    host.board.move(-15);
    host.board.move(4);
    expect(host.told(id)).toEqual([]);
    host.board.move(1);
    expect(host.told(id)).toEqual(['fired']);
  });

  test('is refused when there is no such slot, or it is taken', () => {
    const host = TestHost.connected({ slots: 4 });
    expect(host.told(host.arm({ slot: 4, count: 5 }))).toEqual(['refused badSlot']);
    host.arm({ slot: 3, count: 5 });
    expect(host.told(host.arm({ slot: 3, count: 6 }))).toEqual(['refused slotTaken']);
  });

  test('is refused when its target shares the low byte with an armed one', () => {
    const host = TestHost.connected();
    host.arm({ count: 5 });
    const shared = host.arm({ slot: 1, count: 5 + 256 });
    const below = host.arm({ slot: 2, rising: 0, count: 5 - 512 });
    const other = host.arm({ slot: 3, count: 6 + 256 });
    expect(host.told(shared)).toEqual(['refused sharedLowByte']);
    expect(host.told(below)).toEqual(['refused sharedLowByte']);
    expect(host.told(other)).toEqual([]);
    host.board.move(5);
    expect(host.told(host.arm({ slot: 1, count: 5 + 512 }))).toEqual([]);
  });

  test('is checked like a pulse when it rises', () => {
    const host = TestHost.connected();
    host.configure({ allowanceRises: 1 });
    const first = host.arm({ count: 5 });
    const second = host.arm({ slot: 1, count: 9 });
    host.board.move(5);
    host.live(20_000);
    host.board.move(5);
    expect(host.told(first)).toEqual(['fired', 'done']);
    expect(host.told(second)).toEqual(['refused allowance']);
  });

  test('is ended by a beat that no longer wants it, and its slot is free again', () => {
    const host = TestHost.connected();
    const gone = host.arm({ slot: 0, count: 5 });
    const kept = host.arm({ slot: 1, count: 6 });
    host.wanted = 0b10;
    host.beat();
    expect(host.told(gone)).toEqual(['disarmed unwanted']);
    expect(host.told(host.arm({ slot: 0, count: 5 }))).toEqual([]);
    host.board.move(10);
    expect(host.told(gone)).toEqual(['disarmed unwanted']);
    expect(host.told(kept)).toEqual(['refused busy']);
  });

  test('is armed and fired over the wrap of the count', () => {
    const host = TestHost.connected({ startCount: 2 ** 31 - 5 });
    const up = host.arm({ count: 2 ** 31 + 5 });
    host.board.move(9);
    expect(host.told(up)).toEqual([]);
    host.board.move(1);
    expect(host.told(up)).toEqual(['fired']);
    const down = host.arm({ output: 1, rising: 0, count: 2 ** 31 - 2 });
    host.board.move(-6);
    expect(host.told(down)).toEqual([]);
    host.board.move(-1);
    expect(host.told(down)).toEqual(['fired']);
  });

  test('fires exactly when a walk first comes to its target, as a plain comparison finds it', () => {
    fc.assert(
      fc.property(
        fc.array(fc.record({ rising: fc.boolean(), away: fc.integer({ min: 1, max: 250 }) }), {
          minLength: 1,
          maxLength: 8,
        }),
        fc.array(fc.integer({ min: -120, max: 120 }), { minLength: 1, maxLength: 40 }),
        (wishes, moves) => {
          const host = TestHost.connected({ slots: 8, outputs: 8 });
          const armed: { id: number; target: number; step: number; count?: number }[] = [];
          wishes.forEach(({ rising, away }, slot) => {
            host.configure({ output: slot });
            const target = rising ? away : -away;
            const id = host.arm({ slot, output: slot, rising: rising ? 1 : 0, count: target });
            if (host.told(id).length === 0) armed.push({ id, target, step: rising ? 1 : -1 });
          });
          let count = 0;
          for (const move of moves) {
            for (let n = 0; n < Math.abs(move); n++) {
              count += Math.sign(move);
              for (const one of armed) {
                const comes = count === one.target && Math.sign(move) === one.step;
                if (comes && one.count === undefined) one.count = count;
              }
            }
            host.board.move(move);
          }
          for (const one of armed) {
            expect(host.told(one.id)).toEqual(one.count === undefined ? [] : ['fired']);
          }
        },
      ),
      { seed: 61, numRuns: 300 },
    );
  });
});
