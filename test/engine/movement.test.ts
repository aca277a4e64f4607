import { describe, expect, test } from 'vitest';
import { FACTS, Stage } from './stage.js';

const CROSSINGS = `
places:
  zone: 85 to 95 cm
rules:
  into:
    when: enters zone
    do: note
  out:
    when: leaves zone
    do: note
  spot:
    when: reaches 90 cm
    do: note
`;

describe('sentence 5: lap 1 begins when the animal first passes the seam forwards', () => {
  test('until then the lap is 0 and nothing is reached, entered or left', () => {
    const stage = new Stage(
      CROSSINGS + '  lap_zero:\n    when: lick\n    if: lap is 0\n    do: note\n',
      {
        startCm: 60,
      },
    );
    stage.lick().runTo(179);
    expect(stage.firings().map((d) => d.name)).toEqual(['lap_zero']);
    stage.to(1, 100).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['lap_zero', 'into', 'spot', 'out']);
  });

  test('place and position are unknown before it: a condition on them is not true, nor its `not`', () => {
    const stage = new Stage(
      `
rules:
  inside:
    when: lick
    if: in 0 to 180 cm
    do: note
  outside:
    when: lick
    if: not in 0 to 180 cm
    do: note
  low:
    when: lick
    if: position < 500 cm
    do: note
  not_low:
    when: lick
    if: not position < 500 cm
    do: note
`,
      { startCm: 60 },
    ).lick();
    expect(stage.firings()).toEqual([]);
    stage.to(1, 50).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['inside', 'low']);
  });

  test('on a rig without a seam mark it begins at once, at 0 cm', () => {
    const stage = new Stage(
      `
rules:
  start:
    when: session begins
    if: lap is 1 and position is 0 cm and phase lap is 1
    do: note
  water:
    when: reaches 10 cm
    do: give 4 uL
`,
      { facts: { ...FACTS, seamMark: false } },
    ).runTo(200);
    expect(stage.laps('start')).toEqual([1]);
    expect(stage.places('water')).toEqual([10]);
  });
});

describe('sentence 6: reaches goes by progress, enters and leaves by every crossing', () => {
  test('a place is reached once a lap, whatever the animal turns back', () => {
    const stage = new Stage(CROSSINGS);
    stage.to(1, 93).to(1, 80).to(1, 93).to(1, 89).to(1, 91).to(2, 100);
    expect(stage.laps('spot')).toEqual([1, 2]);
  });

  test('backing over the seam and coming again adds no lap and reaches nothing again', () => {
    const stage = new Stage(`
rules:
  seam:
    when: lap begins
    do: note
  early:
    when: reaches 5 cm
    do: note
  late:
    when: reaches 175 cm
    do: note
`);
    stage.to(2, 10).to(1, 160).to(2, 10).to(1, 170).to(3, 1);
    expect(stage.laps('seam')).toEqual([1, 2, 3]);
    expect(stage.laps('early')).toEqual([1, 2]);
    expect(stage.laps('late')).toEqual([1, 2]);
  });

  test('a place at 0 cm is reached as each lap begins', () => {
    const stage = new Stage('rules:\n  zero:\n    when: reaches 0 cm\n    do: note\n').to(3, 50);
    expect(stage.laps('zero')).toEqual([1, 2, 3]);
  });

  test('every crossing is seen, forwards and backwards, over either edge', () => {
    const stage = new Stage(CROSSINGS);
    stage.to(1, 90).to(1, 80).to(1, 100).to(1, 90).to(1, 100);
    expect(stage.firings().map((d) => d.name)).toEqual([
      'into',
      'spot',
      'out',
      'into',
      'out',
      'into',
      'out',
    ]);
  });

  test('trembling on an edge within the hysteresis is one crossing', () => {
    const stage = new Stage(CROSSINGS);
    stage.to(1, 85.2);
    for (let n = 0; n < 10; n++) stage.to(1, 84.8).to(1, 85.2);
    expect(stage.firings('into').length).toBe(1);
    expect(stage.firings('out').length).toBe(0);
    // Half a centimetre beyond the edge on the far side is a crossing back.
    stage.to(1, 84.4);
    expect(stage.firings('out').length).toBe(1);
  });

  test('after going the hysteresis beyond an edge, the crossing back is seen one count past the edge', () => {
    const stage = new Stage(CROSSINGS);
    stage.to(1, 86).to(1, 84, 4);
    expect(stage.places('out')[0]).toBe(84.96);
  });

  test('a span over the seam is entered before it and left after it', () => {
    const stage = new Stage(`
places:
  zone: 170 to 10 cm
rules:
  into:
    when: enters zone
    do: note
  out:
    when: leaves zone
    do: note
`);
    stage.to(3, 50);
    expect(stage.firings().map((d) => [d.name, d.lap, d.cm])).toEqual([
      // The animal began inside, unseen; leaving is the first crossing.
      ['out', 1, 10],
      ['into', 1, 170],
      ['out', 2, 10],
      ['into', 2, 170],
      ['out', 3, 10],
    ]);
  });

  test('a visit lasts from entering to leaving', () => {
    const stage = new Stage(`
places:
  zone: 85 to 95 cm
rules:
  third:
    when: 3rd lick in zone this visit
    do: note
  two:
    when: leaves zone
    do: note
`);
    stage.to(1, 87).lick(2).to(1, 80).to(1, 87).lick(2).to(1, 99);
    expect(stage.firings('third')).toEqual([]);
    stage.to(2, 87).lick(4).to(2, 99);
    expect(stage.laps('third')).toEqual([2]);
  });
});

describe('sentence 7: a place that moves under the animal is not thereby reached, entered or left', () => {
  const MOVED = `
operator:
  now: 10 to 170 cm, at first 100 cm
phases:
  one: until licks this session >= 1
  two: to the end
places:
  spot: 60 cm, but 40 cm in two
  zone: 80 to 90 cm, but 45 to 55 cm in two
rules:
  water:
    when: reaches spot
    do: give 4 uL
  into:
    when: enters zone
    do: note
  out:
    when: leaves zone
    do: note
`;
  test('moved behind the animal, it waits for the next lap', () => {
    const stage = new Stage(MOVED).to(1, 50).lick().wait(50).to(2, 50);
    expect(stage.firings('water').map((d) => [d.lap, d.cm])).toEqual([[2, 40]]);
  });

  test('moved onto the animal it is not entered, and being left afterwards is a crossing', () => {
    const stage = new Stage(MOVED).to(1, 50).lick().wait(50);
    expect(stage.firings('into')).toEqual([]);
    stage.to(1, 60);
    expect(stage.places('out')).toEqual([55]);
    expect(stage.firings('into')).toEqual([]);
  });

  test('moved away from the animal it is not left', () => {
    const stage = new Stage(MOVED).to(1, 82).lick().wait(500);
    expect(stage.firings().map((d) => d.name)).toEqual(['water', 'into']);
  });

  test('once reached on this lap it does not come again where it has moved to', () => {
    const stage = new Stage(`
phases:
  one: until licks this session >= 1
  two: to the end
places:
  spot: 60 cm, but 140 cm in two
rules:
  water:
    when: reaches spot
    do: give 4 uL
`);
    stage.to(1, 70).lick().to(2, 170);
    expect(stage.firings('water').map((d) => [d.lap, d.cm])).toEqual([
      [1, 60],
      [2, 140],
    ]);
  });
});

describe('a correction of the position is not movement', () => {
  test('places jumped over are missed, and recorded as missed', () => {
    const stage = new Stage(CROSSINGS).to(1, 89).correct(2).to(1, 120);
    expect(stage.firings('spot')).toEqual([]);
    expect(stage.of('missed').map((d) => d.name)).toEqual(['spot']);
    stage.to(2, 120);
    expect(stage.laps('spot')).toEqual([2]);
  });

  test('places jumped back over do not come again', () => {
    const stage = new Stage(CROSSINGS).to(1, 91).correct(-2).to(1, 120);
    expect(stage.laps('spot')).toEqual([1]);
    const entered = new Stage(CROSSINGS).to(1, 86).correct(-2).to(1, 92);
    expect(entered.firings('into').length).toBe(1);
    expect(entered.firings('out').length).toBe(0);
  });

  test('a lap that begins by a correction begins at its 0 cm', () => {
    const stage = new Stage(`
rules:
  seam:
    when: reaches 0 cm
    do: note
  begun:
    when: lap begins
    do: note
  into:
    when: enters 0 to 10 cm
    do: note
  late:
    when: reaches 179.8 cm
    do: note
`);
    stage.to(1, 179.6).correct(0.4).frame(0);
    expect(stage.instant.lap).toBe(2);
    for (const name of ['seam', 'begun', 'into'])
      expect([name, stage.laps(name)]).toEqual([name, [1, 2]]);
    expect(stage.firings('late')).toEqual([]);
    expect(stage.of('missed').map((d) => d.name)).toEqual(['late']);
  });

  test('a backward correction while the furthest stays where it was fires nothing twice', () => {
    const stage = new Stage(CROSSINGS).to(1, 96);
    // As a tracker tells it that keeps the furthest: only the place goes back.
    stage.instant.travelTo -= 50;
    stage.travel -= 50;
    stage.to(1, 94.2).to(1, 120);
    expect(stage.firings().map((d) => d.name)).toEqual(['into', 'spot', 'out']);
  });

  test('an edge jumped over is missed too', () => {
    const stage = new Stage(CROSSINGS).to(1, 84).correct(2).to(1, 120);
    expect(stage.firings('into')).toEqual([]);
    expect(stage.laps('out')).toEqual([1]);
  });
});

describe('sentence 8: what a scope looks back over', () => {
  test('`over the last 2 laps` is whole laps, this one left out', () => {
    const stage = new Stage(`
rules:
  sum:
    when: lap begins
    if: licks over the last 2 laps is 5
    do: note
  now:
    when: lick
    if: licks over the last 2 laps is 5
    do: note
`);
    stage.to(1, 50).lick(2).to(2, 50).lick(3).to(3, 50).lick(1).to(4, 1);
    expect(stage.laps('sum')).toEqual([3]);
    expect(stage.laps('now')).toEqual([3]);
  });

  test('`over the last 2 s` ends now', () => {
    const stage = new Stage(`
rules:
  three:
    when: lick
    if: licks over the last 2 s is 3
    do: note
`);
    stage.begin().wait(3000).lick(3, 500).wait(3000).lick();
    expect(stage.times('three').length).toBe(1);
  });

  test('neither looks back past the start of the present phase', () => {
    const stage = new Stage(`
phases:
  one: for 2 laps
  two: to the end
rules:
  by_lap:
    when: lap begins
    if: licks over the last 2 laps >= 0
    do: note
  by_time:
    when: every 1 s
    if: licks over the last 5 s >= 0
    do: note
`);
    stage.to(6, 1);
    // Phase two begins with lap 3: two whole laps of it have gone by as lap 5 begins.
    expect(stage.laps('by_lap')).toEqual([5, 6]);
    const twoBegan = stage.of('phase')[1]!.ms;
    const early = stage.times('by_time').filter((ms) => ms >= twoBegan && ms < twoBegan + 5000);
    expect(early).toEqual([]);
    expect(stage.times('by_time').some((ms) => ms >= twoBegan + 5000)).toBe(true);
  });

  test('`every 2 s` counts from the start of the session, then from the one before', () => {
    const stage = new Stage('rules:\n  tick:\n    when: every 2 s\n    do: note\n', {
      frameMs: 30,
    });
    stage.begin().wait(9000);
    // Frames come every 30 ms; the moments themselves stay two seconds apart.
    expect(stage.times('tick')).toEqual([2010, 4020, 6000, 8010]);
  });

  test('an interval that is drawn anew is counted from the moment before it', () => {
    const stage = new Stage(`
draws:
  gap: 0.5 to 5 s, every firing of clock
rules:
  clock:
    when: every gap
    do: pulse sync for 10 ms
`);
    stage.begin().wait(60_000);
    const gaps = stage.of('drawn').map((d) => Number(d.value) / 1000);
    let due = 0;
    const expected = gaps.slice(0, -1).map((gap) => (due += gap));
    const times = stage.times('clock');
    expect(times.length).toBe(gaps.length - 1);
    times.forEach((ms, n) => {
      expect(ms - expected[n]!).toBeGreaterThanOrEqual(0);
      expect(ms - expected[n]!).toBeLessThan(10);
    });
    expect(new Set(gaps).size).toBe(gaps.length);
  });
});
