import { describe, expect, test } from 'vitest';
import { COUNTS_PER_CM, LAP, Stage } from './stage.js';

const session = (end: string, phases = '') => `
${phases}
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
end: ${end}
`;

/** At 20 cm/s a lap of 180 cm takes 9 s. */
const LAP_MS = 9_000;

describe('sentence 23: the end announces itself', () => {
  test.each([
    ['laps done this session >= 20', 16],
    ['laps done this session > 19', 16],
    ['lap >= 21', 16],
    ['20 <= laps done this session', 16],
  ])('five laps ahead and exactly, with `%s`', (end, lap) => {
    const stage = new Stage(session(end)).to(30, 0);
    expect(stage.foreseen).toMatchObject([{ lap, laps: 5, exact: true, us: Number.NaN }]);
    expect(stage.instant.lap).toBe(21);
    expect(stage.ended).toBe('its `end` is true');
  });

  test('by the pace of the laps where a time or a volume ends it', () => {
    const byTime = new Stage(session('time >= 6 min')).to(60, 0);
    const [told] = byTime.foreseen;
    expect(told).toMatchObject({ laps: 5, exact: false, what: 'time' });
    // Five laps at 9 s, and what is told between laps is looked at every five seconds.
    expect(told!.us / 1000).toBeGreaterThan(4 * LAP_MS);
    expect(told!.us / 1000).toBeLessThanOrEqual(5 * LAP_MS);
    const byWater = new Stage(session('water given this session >= 80 uL')).to(60, 0);
    expect(byWater.foreseen).toMatchObject([{ laps: 5, exact: false }]);
    expect(byWater.instant.lap - byWater.foreseen[0]!.lap).toBe(4);
  });

  test('with `or` the one that comes first counts, with `and` the one that comes last', () => {
    const either = new Stage(session('laps done this session >= 8 or time >= 10 min')).to(30, 0);
    expect(either.foreseen).toMatchObject([{ lap: 4, laps: 5, exact: true }]);
    const both = new Stage(session('laps done this session >= 8 and time >= 6 min')).to(60, 0);
    expect(both.foreseen).toMatchObject([{ what: 'time' }]);
  });

  test('of the last phase, by its laps; no phase before it does', () => {
    const phases = 'phases:\n  first: for 3 laps\n  last: for 9 laps';
    const stage = new Stage(session('time >= 10 h', phases)).to(30, 0);
    expect(stage.foreseen).toMatchObject([{ laps: 5, exact: true, what: 'laps of this phase' }]);
    expect(stage.instant.lap - stage.foreseen[0]!.lap).toBe(5);
    expect(stage.ended).toBe('the last phase ended');
  });

  test('an animal that stands still before its first lap is told five minutes ahead', () => {
    const stage = new Stage(session('time >= 10 min'), { frameMs: 100 }).wait(600_000);
    expect(stage.foreseen).toHaveLength(1);
    expect(stage.foreseen[0]).toMatchObject({ lap: 0, laps: Number.NaN });
    expect(stage.foreseen[0]!.us / 6e7).toBeCloseTo(5, 1);
  });

  test('told by the time alone, it is told once more when the laps are few', () => {
    const stage = new Stage(session('time >= 3 min')).to(60, 0);
    expect(stage.foreseen.map(({ lap, laps }) => [lap, laps])).toEqual([
      [0, Number.NaN],
      [16, 5],
    ]);
  });

  test('what cannot be foreseen says nothing, and ends all the same', () => {
    const stage = new Stage(session('speed > 40 cm/s'));
    stage.to(4, 0).to(5, 0, 50);
    expect(stage.foreseen).toEqual([]);
    expect(stage.ended).not.toBe('');
  });

  test('the page is told how far the phase has come', () => {
    const phases =
      'phases:\n  base: for 4 laps\n  water_time: until firings of water this phase >= 3\n  rest: to the end';
    const stage = new Stage(session('time >= 10 h', phases)).to(3, 10);
    expect(stage.engine.view().progress).toMatchObject({ done: 3, of: 4 });
    stage.to(6, 100);
    expect(stage.engine.view().progress).toEqual({
      ...{ done: 2, of: 3, unit: '', what: 'firings of water this phase' },
    });
    stage.to(9, 0);
    expect(stage.engine.view().progress).toBeNull();
  });
});

describe('sentence 23: the end is put off', () => {
  test('by laps that begin when it has come', () => {
    const stage = new Stage(session('laps done this session >= 10')).to(7, 0);
    expect(stage.engine.putOff(5, 0)).toBe(true);
    expect(stage.engine.view().end).toMatchObject({ laps: 9, exact: true });
    stage.to(40, 0);
    expect(stage.instant.lap).toBe(16);
    // Told at lap 6, and again five laps before the later end.
    expect(stage.foreseen.map(({ lap, laps }) => [lap, laps])).toEqual([
      [6, 5],
      [11, 5],
    ]);
  });

  test('by minutes, and once more while it waits', () => {
    const stage = new Stage(session('time >= 2 min'), { frameMs: 20 }).wait(60_000);
    stage.engine.putOff(0, 5);
    stage.wait(240_000);
    expect(stage.ended).toBe('');
    expect(stage.engine.view().end).toMatchObject({ exact: false, s: 120 });
    stage.engine.putOff(0, 1);
    stage.wait(170_000);
    expect(stage.ended).toBe('');
    stage.wait(20_000);
    expect(stage.ended).toBe('its `end` is true');
    expect(stage.ms).toBe(480_000);
  });

  test('the last phase waits too, and a condition that is no longer true is obeyed', () => {
    const phases = 'phases:\n  only: until licks over the last 1 s >= 2';
    const stage = new Stage(session('time >= 10 h', phases)).to(1, 0);
    stage.engine.putOff(2, 0);
    stage.wait(1500).lick(2, 100).to(2, 100);
    expect(stage.ended).toBe('');
    stage.to(3, 10);
    expect(stage.ended).toBe('the last phase ended');
    expect(stage.travel - 3 * LAP).toBeLessThan(COUNTS_PER_CM);
  });

  test('no further than 25 laps and 25 minutes in all', () => {
    const { engine } = new Stage(session('laps done this session >= 10')).begin();
    for (let n = 0; n < 5; n++) expect(engine.putOff(5, 0)).toBe(true);
    expect(engine.putOff(1, 0)).toBe(false);
    expect(engine.putOff(0, 26)).toBe(false);
    expect(engine.putOff(0, 25)).toBe(true);
    for (const [laps, minutes] of [
      [0, 0],
      [-5, 6],
      [0.5, 0],
    ] as const)
      expect(engine.putOff(laps, minutes)).toBe(false);
    expect(engine.view().putOff).toEqual({ laps: 25, minutes: 25 });
  });

  test('an `end session` of a rule does not wait', () => {
    const stage = new Stage(
      `${session('time >= 1 h').replace('end:', '  out:\n    when: lap begins\n    if: lap is 4\n    do: end session\nend:')}`,
    ).begin();
    stage.engine.putOff(5, 5);
    stage.to(9, 0);
    expect(stage.instant.lap).toBe(4);
  });
});
