import { describe, expect, test } from 'vitest';
import type { TableRows } from '../../server/rules/ast.js';
import { rulesOf, Stage } from './stage.js';

/** Whether a condition is true at one lick, after what `act` does. */
function holds(condition: string, act: (stage: Stage) => void, sections = ''): boolean {
  const stage = new Stage(`
places:
  zone: 85 to 95 cm
  target: 45 cm
${sections}
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  asked:
    when: operator presses now
    if: ${condition}
    do: note
`);
  stage.begin();
  act(stage);
  stage.press('now');
  return stage.firings('asked').length === 1;
}

describe('section 3: what can be measured', () => {
  const at = (lap: number, cm: number) => (stage: Stage) => void stage.to(lap, cm);
  test.each([
    ['position is 30 to 30 cm', at(2, 30)],
    ['lap is 2', at(2, 30)],
    ['phase lap is 2', at(2, 30)],
    ['laps done this session is 2', at(3, 30)],
    ['laps done over the last 15 s is 2', at(3, 30)],
    ['laps done over the last 2 laps is 2', at(3, 30)],
    ['in zone', at(1, 90)],
    ['in start of zone - 5 cm to end of zone', at(1, 81)],
    ['not in zone', at(1, 96)],
    ['still', at(1, 96)],
    ['speed is 0 to 0 cm/s', at(1, 96)],
    ['position >= target - 5 cm and position <= end of zone', at(1, 41)],
    ['water given this session is 8 uL', at(2, 100)],
    ['water given this lap is 4 uL', at(2, 100)],
    ['water given over the last lap is 4 uL', at(2, 10)],
    ['water given over the last 1 s is 4 uL', at(2, 91)],
    ['water given over the last 1 s is 0 uL', at(2, 130)],
    ['firings of water over the last 2 laps is 2', at(3, 10)],
    [
      'real firings of water this session is 1 and sham firings of water this session is 0',
      at(1, 100),
    ],
    ['time since water fires < 1 s', at(1, 91)],
    ['laps since water fires is 1', at(2, 20)],
    ['laps since reaches target is 1', at(2, 20)],
    ['time since enters zone < 1 s and time since leaves zone > 1 h', at(1, 91)],
    ['time is 9 to 10 s and lap time is 0 to 9 s', at(1, 170)],
    ['mean speed over the last 2 s is 19.9 to 20.1 cm/s', at(1, 90)],
    ['mean speed this lap is 15 to 25 cm/s', at(1, 90)],
  ])('`%s`', (condition, act) => {
    expect(holds(condition, act)).toBe(true);
    expect(holds(`not (${condition})`, act)).toBe(false);
  });

  test('licks by scope and place', () => {
    const act = (stage: Stage): void => {
      stage.to(1, 20).lick(2).to(1, 90).lick(3);
      stage.to(2, 20).lick(1).to(2, 90).lick(2);
    };
    for (const condition of [
      'licks this session is 8',
      'licks this lap is 3',
      'licks in zone this session is 5',
      'licks in zone this visit is 2',
      'licks over the last lap is 5',
      'licks in zone over the last lap is 3',
      'licks in 10 to 30 cm this session is 3',
      'share of licks in zone this lap > 66 %',
      'share of licks in zone over the last lap is 0.6',
      'licks in zone over the last lap / 3 >= 1',
      'time since lick <= 10 ms',
      'time since lick in zone <= 10 ms',
    ]) {
      expect([condition, holds(condition, act)]).toEqual([condition, true]);
    }
  });

  test('mean speed in a place takes only the stretches there', () => {
    const act = (stage: Stage): void => {
      stage.to(1, 85, 40).to(1, 95, 8).to(1, 120, 40);
    };
    expect(holds('mean speed in zone this lap is 7.9 to 8.5 cm/s', act)).toBe(true);
    expect(holds('mean speed this lap > 20 cm/s', act)).toBe(true);
  });

  test('inputs: levels and edges', () => {
    const stage = new Stage(
      `
rules:
  upward:
    when: spikes rises
    do: note
  downward:
    when: shutter falls
    if: spikes is high and shutter is low
    do: note
  recently:
    when: lick
    if: time since spikes rises < 1 s and time since shutter rises > 1 s
    do: note
`,
    ).begin();
    stage.input(3, true).wait(1500).input(2, true).wait(100).input(3, false).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['upward', 'downward', 'recently']);
  });
});

describe('licks as moments', () => {
  test('every lick, a lick in a place, the nth of a lap', () => {
    const stage = new Stage(`
rules:
  any:
    when: lick
    do: note
  there:
    when: lick in 85 to 95 cm
    do: note
  second:
    when: 2nd lick this lap
    do: note
`);
    stage.to(1, 20).lick(1).to(1, 90).lick(2).to(2, 90).lick(3);
    const count = (name: string): number => stage.firings(name).length;
    expect([count('any'), count('there'), count('second')]).toEqual([6, 5, 2]);
  });

  test('500 ms after the third lick of a visit, if still there', () => {
    const stage = new Stage(`
places:
  spout: 85 to 100 cm
rules:
  light:
    when: 500 ms after 3rd lick in spout this visit
    if: in spout
    do: pulse laser for 20 ms
`);
    stage.to(1, 90).lick(4).wait(1000);
    expect(stage.firings('light').length).toBe(1);
    // On the next lap it is gone before the time is up.
    stage.to(2, 97).lick(3).to(2, 120, 60).wait(1000);
    expect(stage.firings('light').length).toBe(1);
  });

  test('a bout comes once, with the lick that makes its number full', () => {
    const stage = new Stage('rules:\n  burst:\n    when: 5 licks within 1 s\n    do: note\n');
    stage.begin().wait(100).lick(12, 120);
    expect(stage.firings('burst').length).toBe(1);
    expect(stage.times('burst')[0]! - 110).toBe(4 * 120);
    stage.wait(2000).lick(5, 200);
    expect(stage.firings('burst').length).toBe(2);
    stage.wait(2000).lick(10, 300);
    expect(stage.firings('burst').length).toBe(2);
  });
});

describe('playback', () => {
  /** The test's rules, with rows put where the loader would. */
  function withRows(rows: TableRows): Stage {
    const file = rulesOf('rules:\n  water:\n    when: lick\n    do: give 4 uL\n');
    const at = { file: 0, start: 0, end: 0 };
    const name = { name: 'table', at };
    const [water, ...rest] = file.rules;
    return new Stage({
      ...file,
      tables: [{ name, file: { name: 'table.csv', at }, rows, at }],
      rules: [{ ...water!, when: { kind: 'every row', table: name, at } }, ...rest],
    });
  }

  test('laps and places: each row comes at its lap and place', () => {
    const rows: TableRows = { kind: 'places', lap: [1, 2, 2, 4], placeCm: [88.24, 50, 90.4, 0] };
    const stage = withRows(rows).to(6, 0, 8);
    expect(stage.firings('water').map((d) => [d.lap, d.cm])).toEqual([
      [1, 88.24],
      [2, 50],
      [2, 90.4],
      [4, 0],
    ]);
  });

  test('times: each row comes at its session time', () => {
    const stage = withRows({ kind: 'times', timeUs: [1_500_000, 2_000_000, 9_000_000] });
    stage.begin().wait(10_000);
    expect(stage.times('water')).toEqual([1500, 2000, 9000]);
  });

  test('a row that a correction jumped over is missed, and the next still comes', () => {
    const rows: TableRows = { kind: 'places', lap: [1, 1], placeCm: [50, 60] };
    const stage = withRows(rows).to(1, 49.6).correct(1).to(1, 100);
    expect(stage.places('water')).toEqual([60]);
    expect(stage.of('missed').length).toBe(1);
  });
});
