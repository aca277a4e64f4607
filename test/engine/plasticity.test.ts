import { describe, expect, test } from 'vitest';
import { FieldPredictor } from '../../server/plasticity/fieldPrediction.js';
import { LEARNED } from '../../server/rules/learned.js';
import { FACTS, Stage } from './stage.js';

const INDUCE = `
rules:
  induce:
    when: reaches 90 cm
    do: pulse laser for 300 ms
  again:
    when: reaches 120 cm
    if: predicted width of induce is 95 to 130 cm
    do: note
`;
const EVOKES = {
  ...FACTS,
  outputs: FACTS.outputs.map((output) => ({ ...output, evokesPlateau: output.name === 'laser' })),
};

/** What an even run at this speed predicts, by the arithmetic alone. */
function evenRun(speedCmPerS: number) {
  const moved = Float64Array.from({ length: 400 }, (_, n) => speedCmPerS * (-3 + (n + 0.5) / 100));
  return new FieldPredictor(180).predict(moved, 90)!;
}

describe('the field that a firing is predicted to leave', () => {
  test.each([12, 20, 40])('is that of the run about it, here at %i cm/s', (speed) => {
    const stage = new Stage(INDUCE).to(2, 170, speed);
    expect(stage.fields).toHaveLength(2);
    const [, field] = stage.fields;
    const expected = evenRun(speed);
    expect(field!.onsetCm).toBeCloseTo(90, 0);
    expect(Math.abs(field!.widthCm - expected.widthCm)).toBeLessThan(1);
    expect(Math.abs(field!.peakCm - expected.peakCm)).toBeLessThan(1);
    expect(Math.abs(field!.shiftCm - expected.shiftCm)).toBeLessThan(1);
  });

  test('is known one second after the firing, and not before', () => {
    const stage = new Stage(INDUCE).to(1, 90, 20);
    stage.wait(990);
    expect(stage.fields).toHaveLength(0);
    stage.wait(40);
    expect(stage.fields).toHaveLength(1);
  });

  test('decides whether the next rule may fire', () => {
    const fast = new Stage(INDUCE).to(1, 130, 20);
    expect(fast.laps('again')).toEqual([1]);
    // At 6 cm/s the field is narrower than the rule asks for.
    const slow = new Stage(INDUCE).to(1, 130, 6);
    expect(slow.fields[0]!.widthCm).toBeLessThan(95);
    expect(slow.laps('again')).toEqual([]);
  });

  test('is unknown before the first firing, and so is its `not`', () => {
    const stage = new Stage(`
rules:
  induce:
    when: reaches 90 cm
    do: pulse laser for 300 ms
  one:
    when: reaches 40 cm
    if: predicted width of induce > 0 cm
    do: note
  other:
    when: reaches 41 cm
    if: not predicted width of induce > 0 cm
    do: note
`).to(2, 60, 20);
    expect(stage.laps('one')).toEqual([2]);
    expect(stage.laps('other')).toEqual([]);
  });

  test('begins anew with the next cell', () => {
    const stage = new Stage(INDUCE).to(1, 115, 20);
    stage.engine.newCell();
    stage.to(1, 130, 20);
    expect(stage.fields).toHaveLength(1);
    expect(stage.laps('again')).toEqual([]);
  });

  test('is made for every firing on an output that the rig says evokes a plateau', () => {
    const rules = `
rules:
  gate:
    when: reaches 90 cm
    sham: lap is 2
    do: pulse laser for 300 ms
  light:
    when: reaches 20 cm
    do: pulse lamp for 300 ms
`;
    const stage = new Stage(rules, { facts: EVOKES }).to(4, 10, 20);
    expect(stage.fields.map(({ rule, lap }) => [rule, lap])).toEqual([
      ['gate', 1],
      ['gate', 3],
    ]);
    expect(new Stage(rules).to(4, 10, 20).fields).toEqual([]);
  });

  test('is not made for a firing that the board refused', () => {
    const stage = new Stage(INDUCE);
    stage.outcome = 'not fired';
    stage.to(1, 170, 20);
    expect(stage.fields).toEqual([]);
  });

  test('takes a correction of the position for no movement', () => {
    const plain = new Stage(INDUCE).to(1, 170, 20);
    const corrected = new Stage(INDUCE).to(1, 60, 20).correct(2).to(1, 170, 20);
    expect(corrected.fields[0]!.widthCm).toBeCloseTo(plain.fields[0]!.widthCm, 0);
  });
});

describe('`learned in`', () => {
  const RULES = `
places:
  zone: 65 to 89 cm
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  told:
    when: lap begins
    if: learned in zone
    do: note
`;
  /** Laps that an animal runs: its speed in the zone, and where it licks in waiting. */
  function run(laps: number, inZone: number, licksCm: readonly number[]): Stage {
    const stage = new Stage(RULES).to(1, 0.04, 30);
    for (let lap = 1; lap <= laps; lap++) {
      for (const cm of [...licksCm.filter((cm) => cm < 65), 65]) {
        stage.to(lap, cm, 30);
        if (cm < 65) stage.lick();
      }
      for (const cm of licksCm.filter((cm) => cm > 65)) stage.to(lap, cm, inZone).lick();
      stage.to(lap, 91, inZone);
      // Two seconds in which it drinks.
      stage.lick(5, 200).to(lap + 1, 0.04, 30);
    }
    return stage;
  }

  test('is true once ten laps meet the criterion, and not a lap sooner', () => {
    expect(run(12, 15, [80, 85]).laps('told')).toEqual([11, 12, 13]);
  });

  test('is not met by an animal that licks everywhere', () => {
    expect(run(12, 15, [20, 40, 60, 85]).laps('told')).toEqual([]);
  });

  test('is not met by one that does not slow down', () => {
    expect(run(12, 30, [80, 85]).laps('told')).toEqual([]);
  });

  test('is not met by one that only drinks: those licks do not wait for water', () => {
    expect(run(12, 15, []).laps('told')).toEqual([]);
  });

  test('needs as many laps of the present phase as the criterion looks back over', () => {
    expect(LEARNED.laps).toBe(10);
    expect(run(9, 15, [80, 85]).laps('told')).toEqual([]);
  });
});
