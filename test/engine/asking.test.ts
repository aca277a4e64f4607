import { describe, expect, test } from 'vitest';
import { Stage } from './stage.js';

const RULES = `
phases:
  baseline: for 20 laps
  induction: to the end
rules:
  induce:
    when: reaches 45 cm
    if: phase is induction
    do: pulse laser for 300 ms
    limit: 1 per lap, 4 per session
    within: 1 cm
    asked: now or in the next 3 laps
  lucky:
    when: reaches 60 cm
    chance: 0 %
    do: pulse lamp for 10 ms
    asked: in the next 2 laps
  closed:
    when: reaches 90 cm
    if: phase is induction
    do: give 4 uL
`;

describe('sentence 22: asked for by the operator', () => {
  test('in the next laps a rule fires at its place whatever its `if` says, and in no other lap', () => {
    const stage = new Stage(RULES).to(2, 20);
    expect(stage.engine.ask('induce', 2)).toBe(true);
    // Not in the lap under way, though its place lies ahead.
    expect(stage.engine.view().rules[0]!.asked).toEqual({ fromLap: 3, toLap: 4 });
    stage.to(7, 0);
    expect(stage.laps('induce')).toEqual([3, 4]);
    for (const cm of stage.places('induce')) expect(cm).toBeCloseTo(45, 6);
    expect(stage.engine.view().rules[0]!.asked).toBeNull();
  });

  test('it is armed for the asked laps alone, and the board fires it', () => {
    const stage = new Stage(RULES);
    stage.slots = true;
    stage.to(2, 0);
    stage.engine.ask('induce', 1);
    stage.to(6, 0);
    expect(
      stage
        .of('armed')
        .filter(({ name }) => name === 'induce')
        .map(({ lap }) => lap),
    ).toEqual([3]);
    expect(stage.laps('induce')).toEqual([3]);
  });

  test('its chance is taken as come up, and the draws of its chance are left as they were', () => {
    const stage = new Stage(RULES).to(1, 10);
    stage.engine.ask('lucky', 2);
    stage.to(6, 0);
    expect(stage.laps('lucky')).toEqual([2, 3]);
    const half = RULES.replace('chance: 0 %', 'chance: 50 %');
    const lapsOf = (asked: boolean) => {
      const run = new Stage(half).to(1, 10);
      if (asked) run.engine.ask('lucky', 2);
      return run.to(20, 0).laps('lucky');
    };
    // By hand in laps 2 and 3; the throws that would have been of laps 2, 3, ... come from lap 4 on.
    const alone = lapsOf(false).filter((lap) => lap >= 2 && lap <= 17);
    expect(lapsOf(true).filter((lap) => lap >= 4)).toEqual(alone.map((lap) => lap + 2));
  });

  test('its limits hold, and the operator is told so', () => {
    const stage = new Stage(RULES).to(1, 0);
    for (const lap of [2, 5]) {
      stage.engine.ask('induce', 3);
      stage.to(lap + 3, 0);
    }
    expect(stage.laps('induce')).toEqual([2, 3, 4, 6]);
    expect(stage.of('withheld')).toMatchObject([{ lap: 7, value: 'its limits leave no room' }]);
  });

  test('its guards, its sham and the trust in the position hold', () => {
    const stage = new Stage(
      RULES.replace('    within: 1 cm', '    sham: lap is 4\n    within: 1 cm'),
    );
    stage.to(2, 0);
    stage.engine.ask('induce', 3);
    stage.guard = () => 'the stimulus is held';
    stage.to(4, 0);
    stage.guard = () => undefined;
    stage.to(5, 0);
    stage.trust = 'doubtful';
    stage.to(6, 0);
    expect(stage.of('withheld').map(({ lap, value }) => [lap, value])).toEqual([
      [3, 'the stimulus is held'],
      [5, 'position is doubtful'],
    ]);
    expect(stage.of('sham').map(({ lap }) => lap)).toEqual([4]);
    expect(stage.of('fired')).toEqual([]);
  });

  test('taken back, it does not fire; asked again, the new laps count', () => {
    const stage = new Stage(RULES).to(1, 0);
    stage.engine.ask('induce', 3);
    expect(stage.engine.withdraw('induce')).toBe(true);
    expect(stage.engine.withdraw('induce')).toBe(false);
    stage.to(3, 0);
    stage.engine.ask('induce', 3);
    stage.engine.ask('induce', 1);
    stage.to(8, 0);
    expect(stage.laps('induce')).toEqual([4]);
  });

  test('now, it fires at the next instant wherever the animal is', () => {
    const stage = new Stage(RULES).to(1, 100);
    const before = stage.ms;
    expect(stage.engine.ask('induce', 0)).toBe(true);
    stage.wait(10);
    expect(stage.firings('induce')).toMatchObject([{ lap: 1, ms: before + 10, cm: 100 }]);
    stage.to(3, 0);
    expect(stage.firings('induce')).toHaveLength(1);
  });

  test('now, with a slot of its own on the board, it waits until that is cleared', () => {
    const stage = new Stage(RULES.replace('if: phase is induction', 'if: phase is baseline'));
    stage.slots = true;
    stage.to(1, 30);
    expect(stage.armed.size).toBe(1);
    stage.engine.ask('induce', 0);
    stage.wait(10);
    // The slot went before the pulse was asked for: the two could have been one too many.
    expect(stage.deeds.filter(({ name }) => name === 'induce').map(({ what }) => what)).toEqual([
      'armed',
      'disarmed',
      'fired',
    ]);
    stage.to(1, 90);
    expect(stage.firings('induce')).toHaveLength(1);
    stage.to(2, 90);
    expect(stage.laps('induce')).toEqual([1, 2]);
  });

  test('a rule whose slot the board never clears is missed, and told', () => {
    const stage = new Stage(RULES.replace('if: phase is induction', 'if: phase is baseline'));
    stage.slots = true;
    stage.disarm = () => {};
    stage.to(1, 30);
    stage.engine.ask('induce', 0);
    stage.wait(400);
    expect(stage.firings('induce')).toEqual([]);
    expect(stage.of('missed')).toMatchObject([
      { value: 'the board did not clear its slot in time' },
    ]);
  });

  test('only what the file allows can be asked for', () => {
    const { engine } = new Stage(RULES).begin();
    expect(engine.ask('closed', 1)).toBe(false);
    expect(engine.ask('closed', 0)).toBe(false);
    expect(engine.ask('lucky', 0)).toBe(false);
    expect(engine.ask('lucky', 3)).toBe(false);
    for (const laps of [-1, 1.5, Number.NaN, 4]) expect(engine.ask('induce', laps)).toBe(false);
    expect(engine.ask('nothing', 1)).toBe(false);
    expect(engine.ask('induce', 3)).toBe(true);
  });

  test('a place that a correction jumps over in an asked lap is told as missed', () => {
    const stage = new Stage(RULES).to(1, 0);
    stage.engine.ask('induce', 1);
    stage.to(2, 44).correct(3).wait(10);
    expect(stage.of('missed')).toMatchObject([{ name: 'induce', lap: 2 }]);
  });
});

describe('a choice in steps', () => {
  const STEPPED = `
operator:
  place: 20 to 140 cm, in steps of 2.5 cm, at first 45 cm
rules:
  light:
    when: reaches place
    do: pulse laser for 5 ms
`;
  test('takes what is on a step, and nothing between', () => {
    const { engine } = new Stage(STEPPED).begin();
    for (const cm of [20, 22.5, 137.5, 140, 20 + 2.5 * 0.1 * 30]) {
      expect(engine.choose('place', cm)).toBe(true);
    }
    for (const cm of [19.9, 21, 22.4999, 141]) expect(engine.choose('place', cm)).toBe(false);
  });

  test('says from which lap it counts, and tells when it does', () => {
    const stage = new Stage(STEPPED).to(3, 10);
    stage.engine.choose('place', 50);
    expect(stage.engine.view().choices[0]).toMatchObject({ queued: 50, fromLap: 4 });
    stage.to(4, 10);
    expect(stage.chosenSoFar).toEqual([{ choice: 0, value: 50, lap: 4 }]);
  });
});
