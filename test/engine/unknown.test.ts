import { describe, expect, test } from 'vitest';
import { Stage } from './stage.js';

/** Rules named `yes` and `no` that fire at a lick if a condition is true, or its `not`. */
function both(condition: string, sections = ''): string {
  return `${sections}
rules:
  yes:
    when: lick
    if: ${condition}
    do: note
  no:
    when: lick
    if: not (${condition})
    do: note
`;
}

function answers(stage: Stage): string[] {
  const before = stage.deeds.length;
  stage.wait(200).lick();
  return stage.deeds
    .slice(before)
    .filter((d) => d.what === 'fired')
    .map((d) => d.name);
}

describe('sentence 9: what is unknown makes neither a condition nor its `not` true', () => {
  test('a draw not yet made', () => {
    const stage = new Stage(both('side is left', 'draws:\n  side: left or left2, every lap'));
    expect(answers(stage.begin())).toEqual([]);
    expect(answers(stage.to(1, 10)).length).toBe(1);
  });

  test('a scope longer than what has gone by', () => {
    const laps = new Stage(both('licks over the last 2 laps > 100'));
    expect(answers(laps.to(2, 100))).toEqual([]);
    expect(answers(laps.to(3, 1))).toEqual(['no']);
    const seconds = new Stage(both('licks over the last 2 s > 100'));
    expect(answers(seconds.begin())).toEqual([]);
    expect(answers(seconds.wait(2000))).toEqual(['no']);
  });

  test('a visit when outside', () => {
    const zone = 'places:\n  zone: 85 to 95 cm';
    const stage = new Stage(both('licks in zone this visit >= 1', zone));
    expect(answers(stage.to(1, 50))).toEqual([]);
    expect(answers(stage.to(1, 90))).toEqual(['yes']);
    expect(answers(stage.to(1, 97))).toEqual([]);
  });

  test('a speed in a place not yet passed', () => {
    const zone = 'places:\n  zone: 85 to 95 cm';
    const stage = new Stage(both('mean speed in zone this session > 1 cm/s', zone));
    expect(answers(stage.to(1, 50))).toEqual([]);
    expect(answers(stage.to(1, 100))).toEqual(['yes']);
  });

  test('a share of no licks', () => {
    const zone = 'places:\n  zone: 85 to 95 cm';
    const share = both('share of licks in zone over the last lap > 50 %', zone);
    const stage = new Stage(share);
    expect(answers(stage.to(2, 10))).toEqual([]);
    // The lick that asked was made on lap 2 outside the zone.
    expect(answers(stage.to(3, 10))).toEqual(['no']);
  });

  test('a division by zero', () => {
    const stage = new Stage(both('licks this lap / (lap - 1) > 1'));
    expect(answers(stage.to(1, 10))).toEqual([]);
    expect(answers(stage.to(2, 10))).toEqual(['no']);
    const never = new Stage(both('lap is a multiple of 0'));
    expect(answers(never.to(1, 10))).toEqual([]);
  });

  test('but a condition that does not turn on the unknown is decided', () => {
    const draws = 'draws:\n  side: left or right, every lap';
    expect(answers(new Stage(both('side is left or lap is 0', draws)).begin())).toEqual(['yes']);
    expect(answers(new Stage(both('side is left and lap is 1', draws)).begin())).toEqual(['no']);
  });
});

describe('sentence 10: since something that never happened is longer than any number', () => {
  const water = '\n  water:\n    when: operator presses drop\n    do: give 4 uL\n';
  test('time and laps since', () => {
    expect(answers(new Stage(both('time since water fires > 1000 h') + water).begin())).toEqual([
      'yes',
    ]);
    expect(answers(new Stage(both('laps since water fires > 100000') + water).begin())).toEqual([
      'yes',
    ]);
  });

  test('and is counted once it has happened', () => {
    const stage = new Stage(both('laps since water fires is 2') + water);
    stage.to(1, 50).press('drop');
    expect(answers(stage.to(2, 50))).toEqual(['no']);
    expect(answers(stage.to(3, 50))).toEqual(['yes']);
  });
});
