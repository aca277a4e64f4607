import { describe, expect, test } from 'vitest';
import {
  ERROR_BINS,
  ERRORS_KEPT,
  FiringErrors,
  spreadOf,
} from '../../dashboard/model/firingErrors.js';
import { emptyLive, take } from '../../dashboard/model/live.js';
import type { StampedDecision } from '../../server/session/decisions.js';

const stamp = { input: 1, boardUs: 1, lap: 2, positionCm: 45, speedCmPerS: 20 };
const fired = (armed: boolean, errorMm: number | null): StampedDecision => ({
  ...stamp,
  ...{ kind: 'fired', rule: 'light', serial: 1, sham: false, armed, output: 'laser' },
  ...{ riseUs: 1, placeCm: 45, riseCm: 45, errorMm },
});

describe('how far firings were from their places', () => {
  test('is kept apart for those that the board started and those of the host', () => {
    const live = emptyLive();
    const events = [fired(true, -0.2), fired(true, 0.4), fired(false, 3.1), fired(true, null)];
    const numbered = events.map((event, n) => ({ number: n + 1, event }));
    take(live, { tell: 'events', events: numbered }, 0);
    expect(live.errors.board).toEqual([-0.2, 0.4]);
    expect(live.errors.host).toEqual([3.1]);
    expect(live.errors.scaleMm).toBe(5);
    const began: StampedDecision = { ...stamp, kind: 'session began', title: 'next', seed: 'x' };
    take(live, { tell: 'events', events: [{ number: 5, event: began }] }, 0);
    expect([live.errors.board, live.errors.host]).toEqual([[], []]);
  });

  test('is told by its median and its most, whichever side they are on', () => {
    expect(spreadOf([], 1)).toBeUndefined();
    expect(spreadOf([-0.3, 0.1, -0.9], 1)).toMatchObject({ count: 3, medianMm: 0.3, mostMm: 0.9 });
    expect(spreadOf([-0.5, 0.25], 1)).toMatchObject({ medianMm: 0.375 });
  });

  test('fills bins from one end of the scale to the other, and loses none', () => {
    const { bins } = spreadOf([-1, 0, 1, 0.001, 9, -9], 1)!;
    expect(bins).toHaveLength(ERROR_BINS);
    expect([bins[0], bins[(ERROR_BINS - 1) / 2], bins.at(-1)]).toEqual([2, 2, 2]);
  });

  test('keeps the newest', () => {
    const errors = new FiringErrors();
    for (let n = 0; n < ERRORS_KEPT + 3; n++) errors.add(false, n);
    expect(errors.host).toHaveLength(ERRORS_KEPT);
    expect(errors.host[0]).toBe(3);
  });
});
