import { describe, expect, it } from 'vitest';
import type { RareInput } from '../../server/session/inputs.js';
import { RecordClock } from '../../server/session/record/recordClock.js';
import { identity } from './identity.js';

function linkUp(bootId: number, wraps: number, boardUs: number): RareInput {
  const board = { ...identity, bootId, wraps, boardUs };
  return { kind: 'link up', identity: board, tag: 1, sameBoot: false, overNetwork: false };
}

describe("the record's clock", () => {
  it('counts from the first stamp, whatever that is', () => {
    const clock = new RecordClock(undefined);
    clock.input({ kind: 'begin', firstId: 1 });
    expect(clock.sessionUs).toBe(0);
    clock.raw(4_000_000_000);
    clock.raw(4_000_000_500);
    expect(clock.sessionUs).toBe(500);
  });

  it('goes on over a wrap of the 32-bit clock', () => {
    const clock = new RecordClock(undefined);
    clock.raw(0xffff_fff0);
    clock.raw(0x10);
    expect(clock.sessionUs).toBe(0x20);
  });

  it('never falls, though a stamp comes late', () => {
    const clock = new RecordClock(undefined);
    clock.raw(1000);
    clock.raw(9000);
    clock.input({ kind: 'edge', message: { boardUs: 8500, count: 0, input: 0, level: 1 } });
    expect(clock.sessionUs).toBe(8000);
    clock.raw(9500);
    expect(clock.sessionUs).toBe(8500);
  });

  it('does not take wraps it had not heard of for time that passed', () => {
    const clock = new RecordClock(undefined);
    clock.raw(1000);
    clock.input({ kind: 'clock', message: { boardUs: 2000, wraps: 3 } });
    expect(clock.sessionUs).toBe(1000);
  });

  it('counts a silence of hours, from the wraps the same board reports afterwards', () => {
    const clock = new RecordClock(undefined);
    clock.input(linkUp(7, 0, 1000));
    clock.input({ kind: 'link down', reason: 'silence' });
    clock.input(linkUp(7, 3, 1000));
    expect(clock.sessionUs).toBe(3 * 2 ** 32);
  });

  it('takes how long a board was away from the host when another boot answers', () => {
    const clock = new RecordClock(undefined, () => 5_000_000);
    clock.input(linkUp(7, 0, 1000));
    clock.raw(1_001_000);
    clock.input(linkUp(8, 0, 20));
    expect(clock.sessionUs).toBe(5_000_000);
    clock.raw(1020);
    expect(clock.sessionUs).toBe(5_001_000);
  });

  it('without a host to ask, goes on from where it stood', () => {
    const clock = new RecordClock(undefined);
    clock.input(linkUp(7, 0, 1000));
    clock.raw(1_001_000);
    clock.input(linkUp(8, 0, 20));
    clock.raw(1020);
    expect(clock.sessionUs).toBe(1_001_000);
  });

  it('pays no heed to an outcome told again, which may be of another boot', () => {
    const clock = new RecordClock(undefined);
    clock.raw(1000);
    const message = {
      id: 1,
      kind: 1,
      reason: 0,
      output: 0,
      repeated: 1,
      boardUs: 9e8,
      count: 0,
      onUs: 0,
    };
    clock.input({ kind: 'outcome', message });
    expect(clock.sessionUs).toBe(0);
  });

  it('goes on from a point taken of another clock', () => {
    const one = new RecordClock(undefined);
    one.input(linkUp(7, 2, 5000));
    one.raw(6000);
    const two = new RecordClock(one.point());
    two.raw(7000);
    expect(two.sessionUs).toBe(2000);
  });
});
