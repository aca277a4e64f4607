import { describe, expect, test } from 'vitest';
import { Stage } from './stage.js';

describe('sentence 19: outputs', () => {
  const LIT = `
places:
  lit: 45 to 75 cm
rules:
  light:
    when: enters lit
    do: pulse laser for 5 ms at 20 Hz while in lit, up to 3 s
    limit: 1 per lap
`;
  test('a train up to a longest time has as many pulses as end within it', () => {
    const stage = new Stage(LIT).to(1, 46);
    expect(stage.requests[0]!.orders[0]).toMatchObject({
      ...{ widthUs: 5000, periodUs: 50_000, repeats: 60, stoppable: true },
    });
  });

  test('`while` stops it at the first instant it is not true, for good', () => {
    const stage = new Stage(LIT).to(1, 80, 20);
    expect(stage.of('stop').map((d) => [d.name, d.cm])).toEqual([['laser', 75]]);
    stage.to(1, 70).wait(500);
    // Back in the span it does not go on; entering anew would be another firing.
    expect(stage.of('stop').length).toBe(1);
    expect(stage.requests.length).toBe(1);
  });

  test('once the output has fallen by itself nothing is stopped', () => {
    const stage = new Stage(LIT).to(1, 50);
    stage.engine.outputIdle(1);
    stage.to(1, 80);
    expect(stage.of('stop')).toEqual([]);
  });

  test('a hold lasts up to its time and is stopped by its `while`', () => {
    const stage = new Stage(`
rules:
  glow:
    when: lick
    do: hold lamp while speed > 2 cm/s, up to 3 s
`);
    stage.to(1, 20).instant.speedCmPerS = 10;
    stage.lick();
    // The belt stands at the lick: what may only go on while it runs does not begin.
    expect(stage.firings()).toEqual([]);
    expect(stage.of('missed').length).toBe(1);
  });

  test('a hold begun while running ends when the belt stops', () => {
    const stage = new Stage(`
rules:
  glow:
    when: reaches 20 cm
    do: hold lamp while speed > 2 cm/s, up to 3 s
`).to(1, 30);
    expect(stage.requests[0]!.orders[0]).toMatchObject({
      ...{ widthUs: 3_000_000, repeats: 1, stoppable: true },
    });
    expect(stage.of('stop')).toEqual([]);
    stage.wait(100);
    expect(stage.of('stop').map((d) => d.name)).toEqual(['lamp']);
  });

  test('a phase change stops nothing under way and cancels nothing delayed', () => {
    const stage = new Stage(`
phases:
  one: for 1 s
  two: to the end
rules:
  glow:
    when: lick
    do:
      - hold lamp while time < 10 s, up to 3 s
      - after 2 s, pulse tone for 100 ms
`);
    stage.lick().wait(3000);
    expect(stage.of('stop')).toEqual([]);
    expect(stage.requests.map((r) => r.orders[0]!.output)).toEqual([2, 3]);
  });

  test('a delayed action is guarded when it is due, and is not another firing', () => {
    const stage = new Stage(`
rules:
  glow:
    when: lick
    do:
      - pulse lamp for 20 ms
      - after 500 ms, pulse tone for 100 ms
      - after 800 ms, stop lamp
`);
    stage.guard = (request) => (request.orders[0]!.output === 3 ? 'the tone is busy' : undefined);
    stage.lick().wait(1000);
    expect(stage.of('withheld').map((d) => [d.name, d.value, d.ms])).toEqual([
      ['glow', 'the tone is busy', 510],
    ]);
    expect(stage.of('stop').map((d) => d.ms)).toEqual([810]);
    expect(stage.engine.view().rules[0]!.firings).toBe(1);
  });

  test('a delayed hold that the board refused is held no more: nothing of another is stopped', () => {
    const stage = new Stage(`
rules:
  glow:
    when: lick
    do: after 500 ms, hold lamp while licks this session < 2, up to 3 s
`);
    stage.outcome = 'not fired';
    stage.lick().wait(1000).lick().wait(100);
    expect(stage.requests.length).toBe(1);
    expect(stage.of('stop')).toEqual([]);
  });

  test('a firing that the board refused takes its delayed actions along', () => {
    const stage = new Stage(`
rules:
  glow:
    when: lick
    do:
      - pulse lamp for 20 ms
      - after 500 ms, pulse tone for 100 ms
`);
    stage.outcome = 'not fired';
    stage.lick().wait(1000);
    expect(stage.requests.length).toBe(1);
  });
});

describe('sentence 18: arming', () => {
  const ARMED = `
rules:
  light:
    when: reaches 60 cm
    if: licks this lap >= 1
    do: pulse laser for 100 ms
    limit: 2 per session
`;
  test('armed while `if` is true and the place lies close ahead', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    stage.to(1, 25);
    expect(stage.of('armed')).toEqual([]);
    stage.lick().to(1, 29.8);
    expect(stage.of('armed')).toEqual([]);
    stage.to(1, 31);
    expect(stage.of('armed').map((d) => [d.name, d.value])).toEqual([['light', 240]]);
    stage.to(1, 61);
    expect(stage.firings('light').map((d) => d.cm)).toEqual([60]);
    // The board did it: the host was not asked.
    expect(stage.requests).toEqual([]);
  });

  test('disarmed when its condition stops holding, and then the crossing fires nothing', () => {
    const stage = new Stage(ARMED.replace('licks this lap >= 1', 'speed >= 10 cm/s'));
    stage.slots = true;
    stage.to(1, 55).wait(20);
    expect(stage.of('disarmed').length).toBe(1);
    stage.to(1, 70, 5);
    expect(stage.firings()).toEqual([]);
    expect(stage.of('missed')).toEqual([]);
  });

  test('the `if` that counts is that of the last frame before the crossing', () => {
    const stage = new Stage(ARMED.replace('licks this lap >= 1', 'speed >= 10 cm/s'));
    stage.to(1, 59.96, 20);
    // No slot to be had, and the crossing itself comes in a slow frame.
    stage.frame(1);
    expect(stage.firings('light').length).toBe(1);
    stage.to(2, 59.96, 5).frame(5);
    expect(stage.firings('light').length).toBe(1);
  });

  test('limits count what the board fired', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    for (let lap = 1; lap <= 5; lap++) stage.to(lap, 10).lick();
    expect(stage.laps('light')).toEqual([1, 2]);
    expect(stage.of('armed').length).toBe(2);
  });

  test('what the board did not fire after all is asked through the host, once', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    stage.boardFires = false;
    stage.to(1, 10).lick().to(1, 70);
    expect(stage.requests.length).toBe(1);
    expect(stage.firings('light').length).toBe(1);
    expect(stage.requests[0]!.placeTravel).toBe(6000);
  });

  test('and is missed when its time has passed by then', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    stage.to(1, 10).lick().to(1, 59);
    const [[rule, request] = [-1, undefined]] = stage.armed;
    stage.armed.clear();
    stage.to(1, 60).to(1, 62, 20);
    stage.engine.settle(rule, request!.serial, 'not fired', stage.instant);
    expect(stage.firings('light')).toEqual([]);
    expect(stage.of('missed').length).toBe(1);
  });

  test('a word of the board that comes before the crossing is seen counts once', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    stage.to(1, 10).lick().to(1, 59.9);
    const [[rule, request] = [-1, undefined]] = stage.armed;
    stage.armed.clear();
    stage.engine.settle(rule, request!.serial, 'fired', stage.instant);
    stage.to(1, 70);
    expect(stage.engine.view().rules[0]!.firings).toBe(1);
    expect(stage.requests).toEqual([]);
  });

  test('what was armed at a higher speed is still disarmed when its condition ends', () => {
    const stage = new Stage(ARMED.replace('licks this lap >= 1', 'speed >= 10 cm/s'));
    stage.slots = true;
    // At 40 cm/s the horizon is 60 cm; at rest only 30.
    stage.to(1, 8, 40);
    expect(stage.armed.size).toBe(1);
    stage.wait(20);
    expect(stage.armed.size).toBe(0);
  });

  test('never across the seam, nor for a place behind', () => {
    const stage = new Stage(
      'rules:\n  light:\n    when: reaches 5 cm\n    do: pulse laser for 100 ms\n',
    );
    stage.slots = true;
    stage.to(1, 179);
    expect(stage.of('armed').map((d) => d.lap)).toEqual([1]);
    stage.to(2, 1);
    expect(stage.of('armed').map((d) => d.lap)).toEqual([1, 2]);
  });

  test('armed again when the shape changes', () => {
    const stage = new Stage(`
operator:
  wide: 100 ms or 200 ms, at first 100 ms
rules:
  light:
    when: reaches 60 cm
    do: pulse laser for wide
`);
    stage.slots = true;
    stage.to(1, 40);
    stage.engine.choose('wide', 200_000);
    stage.wait(50);
    expect(stage.armed.get(0)!.orders[0]!.widthUs).toBe(200_000);
    expect(stage.of('armed').length).toBe(2);
  });

  test('a seam correction arms anew under another serial', () => {
    const stage = new Stage(ARMED);
    stage.slots = true;
    stage.to(1, 10).lick().to(1, 50);
    const before = stage.armed.get(0)!.serial;
    stage.correct(1).to(1, 55);
    expect(stage.armed.get(0)!.serial).toBeGreaterThan(before);
    stage.to(1, 70);
    expect(stage.firings('light').length).toBe(1);
  });

  test('a chance that will not come up is not armed; one that will is, and both are used up', () => {
    const rules = `
rules:
  light:
    when: reaches 60 cm
    chance: 50 %
    do: pulse laser for 100 ms
`;
    const host = new Stage(rules).to(30, 0);
    const board = new Stage(rules);
    board.slots = true;
    board.to(30, 0);
    expect(board.laps('light')).toEqual(host.laps('light'));
    expect(board.laps('light').length).toBeGreaterThan(5);
    expect(board.laps('light').length).toBeLessThan(25);
    expect(board.requests).toEqual([]);
  });

  test('enters and leaves are armed going forwards', () => {
    const stage = new Stage(`
places:
  zone: 50 to 60 cm
rules:
  into:
    when: enters zone
    do: pulse laser for 10 ms
  out:
    when: leaves zone
    do: pulse lamp for 10 ms
`);
    stage.slots = true;
    stage.to(1, 70);
    expect(stage.of('armed').map((d) => [d.name, d.value])).toEqual([
      ['into', 230],
      ['out', 240],
    ]);
    expect(stage.places('into')).toEqual([50]);
    expect(stage.places('out')).toEqual([60]);
    expect(stage.requests).toEqual([]);
  });
});
