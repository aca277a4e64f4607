import { describe, expect, test } from 'vitest';
import { Stage } from './stage.js';

const NOTE = 'rules:\n  mark:\n    when: lap begins\n    do: note\n';

/** Each phase that began, and the lap and place of its beginning. */
function phases(stage: Stage): (string | number)[][] {
  return stage.of('phase').map((d) => [d.value ?? d.name, d.lap, Number.isNaN(d.cm) ? -1 : d.cm]);
}

describe('sentence 11: phases', () => {
  test('follow each other as written, and the session ends with the last', () => {
    const stage = new Stage(`phases:\n  one: for 1 lap\n  two: for 2 laps\n${NOTE}`).to(9, 0);
    expect(phases(stage)).toEqual([
      ['one', 0, -1],
      ['two', 2, 0],
    ]);
    expect(stage.deeds.at(-1)).toMatchObject({ what: 'end', lap: 4, cm: 0 });
    expect(stage.ended).toBe('the last phase ended');
  });

  test('`for 2 laps` is whole laps: the part lap at its start is not counted', () => {
    const stage = new Stage(`
phases:
  one: until licks this session >= 1
  two: for 2 laps
  three: to the end
${NOTE}`);
    stage.to(1, 50).lick().to(5, 0);
    // Two begins at 50 cm of lap 1; its whole laps are 2 and 3.
    expect(phases(stage).map((p) => p.slice(0, 2))).toEqual([
      ['one', 0],
      ['two', 1],
      ['three', 4],
    ]);
  });

  test('a phase ends at the first instant it may, even in mid-lap', () => {
    const stage = new Stage(`phases:\n  one: for 3 s\n  two: to the end\n${NOTE}`).to(2, 0);
    const two = stage.of('phase')[1]!;
    expect(two.ms).toBe(3000);
    expect(two.cm).toBeGreaterThan(0);
  });

  test('whichever comes first of two lengths', () => {
    const rules = `phases:\n  one: for 3 laps or 15 s\n  two: to the end\n${NOTE}`;
    const slow = new Stage(rules).to(3, 0);
    expect(slow.of('phase')[1]!.ms).toBe(15_000);
    const fast = new Stage(rules).to(9, 0, 60);
    expect(fast.of('phase')[1]!.lap).toBe(4);
  });

  test('with `at lap end` it ends when the next lap begins after that', () => {
    const stage = new Stage(
      `phases:\n  one: until licks this phase >= 2, at lap end\n  two: to the end\n${NOTE}`,
    );
    stage.to(1, 50).lick(2).wait(1000).to(3, 0);
    expect(phases(stage)[1]).toEqual(['two', 2, 0]);
  });

  test('`for 2 laps, at lap end` is not a lap longer', () => {
    const stage = new Stage(`phases:\n  one: for 2 laps, at lap end\n  two: to the end\n${NOTE}`);
    expect(phases(stage.to(5, 0))[1]).toEqual(['two', 3, 0]);
  });

  test('`go to` is done at the next instant and starts the phase afresh', () => {
    const stage = new Stage(`
phases:
  one: to the end
  two: to the end
rules:
  back:
    when: lick
    do: go to one
  fresh:
    when: one begins
    if: licks this phase is 0 and phase time <= 0 s
    do: note
`);
    stage.begin().wait(500).lick();
    expect(stage.of('phase').length).toBe(1);
    stage.frame(0);
    expect(stage.of('phase').map((d) => d.ms)).toEqual([0, 520]);
    expect(stage.times('fresh')).toEqual([0, 520]);
  });

  test('`go to next phase`, from the last, ends the session', () => {
    const stage = new Stage(`
phases:
  one: to the end
  two: to the end
rules:
  onward:
    when: lick
    do: go to next phase
`);
    stage.lick().wait(100);
    expect(stage.of('phase').map((d) => d.value ?? d.name)).toEqual(['one', 'two']);
    stage.lick().wait(100);
    expect(stage.ended).toBe('the last phase ended');
  });

  test('a phase may end on behaviour: the share of licks in a place over its last laps', () => {
    const stage = new Stage(`
places:
  spot: 90 cm
  before: spot - 30 cm to spot
phases:
  first: until share of licks in before over the last 3 laps > 70 %
  second: to the end
${NOTE}`);
    for (let lap = 1; lap <= 4; lap++) {
      stage.to(lap, 20).lick(lap <= 2 ? 3 : 0);
      stage.to(lap, 80).lick(4).to(lap, 170);
    }
    // Laps 1-3 give 12 of 18, not enough; laps 2-4 give 12 of 15: it ends as lap 5 begins.
    stage.to(6, 0);
    expect(phases(stage)[1]).toEqual(['second', 5, 0]);
  });

  test('values and places differ by phase', () => {
    const stage = new Stage(`
values:
  drop: 4 uL, but 2 uL in two
places:
  spot: 60 cm, but 140 cm in two
phases:
  one: for 1 lap
  two: to the end
rules:
  water:
    when: reaches spot
    do: give drop
`).to(3, 0);
    expect(stage.places('water')).toEqual([60, 140]);
    expect(stage.requests.map((r) => r.orders[0]!.volumeNl)).toEqual([4000, 2000]);
    // The valve's calibrated line: 8 ms and 12 us a nanolitre.
    expect(stage.requests.map((r) => r.orders[0]!.widthUs)).toEqual([56_000, 32_000]);
  });
});

describe('sentence 13: the operator', () => {
  const LIT = `
operator:
  light_at: 20 to 140 cm, at first 45 cm
  drop: 2 uL or 4 uL, at first 4 uL
  mode: easy or hard, at first easy
places:
  lit: light_at to light_at + 30 cm
rules:
  light:
    when: enters lit
    do: pulse laser for 5 ms
  extra:
    when: operator presses more
    do: give drop
    limit: at least 5 s apart
  hard_mark:
    when: mode is hard
    do: note
`;
  test('a choice that moves a place takes effect when the next lap begins', () => {
    const stage = new Stage(LIT).to(1, 20);
    stage.engine.choose('light_at', 100);
    expect(stage.engine.view().choices[0]).toEqual({
      name: 'light_at',
      value: 45,
      queued: 100,
      fromLap: 2,
    });
    stage.to(3, 0);
    expect(stage.places('light')).toEqual([45, 100]);
    expect(stage.engine.view().choices[0]).toEqual({
      name: 'light_at',
      value: 100,
      queued: null,
      fromLap: null,
    });
  });

  test('any other takes effect at the next instant', () => {
    const stage = new Stage(LIT).begin().press('more');
    stage.engine.choose('drop', 2000);
    stage.engine.choose('mode', 'hard');
    stage.wait(5000).press('more');
    expect(stage.requests.map((r) => r.orders[0]!.volumeNl)).toEqual([4000, 2000]);
    expect(stage.times('hard_mark')).toEqual([20]);
  });

  test('a choice out of its bounds, or of no such name, is refused and changes nothing', () => {
    const stage = new Stage(LIT).begin();
    expect(stage.engine.choose('light_at', 150)).toBe(false);
    expect(stage.engine.choose('light_at', 'easy')).toBe(false);
    expect(stage.engine.choose('drop', 3000)).toBe(false);
    expect(stage.engine.choose('mode', 'extreme')).toBe(false);
    expect(stage.engine.choose('nothing', 1)).toBe(false);
    expect(stage.engine.choose('light_at', 140)).toBe(true);
  });

  test('a press is a moment, under the limits of its rule', () => {
    const stage = new Stage(LIT).begin().press('more').press('more').press('unknown');
    stage.wait(5000).press('more');
    expect(stage.times('extra')).toEqual([10, 5040]);
  });

  test('the operator may go to the next phase, the one before, this one again, or any by name', () => {
    const stage = new Stage(
      `phases:\n  one: to the end\n  two: to the end\n  three: to the end\n${NOTE}`,
    ).begin();
    for (const to of ['next', 'three', 'previous', 'repeat', 'one', 'previous']) {
      stage.engine.goTo(to);
      stage.frame(0);
    }
    expect(stage.of('phase').map((d) => d.name)).toEqual([
      'one',
      'two',
      'three',
      'two',
      'two',
      'one',
      'one',
    ]);
  });
});

describe('sentence 20: cells', () => {
  const CELLS = `
draws:
  side: left or right or middle, every cell
phases:
  one: for 2 laps
  two: to the end
rules:
  cell_mark:
    when: cell begins
    do: note
  some:
    when: reaches 50 cm
    do: pulse lamp for 20 ms
    limit: 3 per cell, 5 per session
  water:
    when: reaches 90 cm
    do: give 4 uL
  counted:
    when: reaches 100 cm
    if: firings of water this cell is 1 and firings of water this session is 4
    do: note
`;
  test('a session begins with the first; the next begins the phases, counts and limits anew', () => {
    const stage = new Stage(CELLS).to(4, 20);
    expect(stage.laps('some')).toEqual([1, 2, 3]);
    stage.engine.newCell();
    expect(stage.engine.cell).toBe(2);
    stage.to(8, 0);
    expect(stage.of('cell').map((d) => d.value)).toEqual([1, 2]);
    expect(stage.laps('cell_mark')).toEqual([0, 4]);
    expect(phases(stage).map((p) => p.slice(0, 2))).toEqual([
      ['one', 0],
      ['two', 3],
      ['one', 4],
      // Two whole laps after the part lap in which the cell began.
      ['two', 7],
    ]);
    // Three per cell begins anew, five per session goes on.
    expect(stage.laps('some')).toEqual([1, 2, 3, 4, 5]);
    expect(stage.laps('counted')).toEqual([4]);
    expect(stage.of('drawn').length).toBe(2);
  });

  test('laps and water go on', () => {
    const stage = new Stage(`
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  much:
    when: water given this session >= 10 uL
    do: note
  two_done:
    when: laps done this cell >= 2
    do: note
`);
    stage.to(2, 100);
    stage.engine.newCell();
    stage.to(6, 0);
    expect(stage.laps('much')).toEqual([3]);
    expect(stage.laps('two_done')).toEqual([5]);
  });
});

describe('sentence 21: when the session ends', () => {
  test('nothing delayed remains, and nothing more is asked', () => {
    const stage = new Stage(`
rules:
  later:
    when: lick
    do:
      - after 500 ms, pulse lamp for 20 ms
      - note
  finish:
    when: operator presses finish
    do: end session
`);
    stage.lick().press('finish').wait(2000).lick();
    expect(stage.ended).toBe('rule finish');
    expect(stage.requests).toEqual([]);
    expect(stage.of('note').length).toBe(1);
  });

  test('`end` ends it by any condition', () => {
    const stage = new Stage(`${NOTE}end: time >= 20 s or laps done this session >= 2\n`).to(9, 0);
    expect(stage.ms).toBeLessThanOrEqual(20_000);
    expect(stage.ended).toBe('its `end` is true');
    const fast = new Stage(`${NOTE}end: time >= 20 s or laps done this session >= 2\n`);
    fast.to(9, 0, 100);
    expect(fast.deeds.at(-1)).toMatchObject({ what: 'end', lap: 3 });
  });
});
