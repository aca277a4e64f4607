import { describe, expect, test } from 'vitest';
import { COUNTS_PER_CM, LAP, Stage } from './stage.js';

describe('sentence 14: if, chance, limits, guard, all or nothing', () => {
  test('a firing that the guard withholds is recorded, and uses up no limit', () => {
    const stage = new Stage(`
rules:
  water:
    when: lick
    do: give 4 uL
    limit: 2 per session
`);
    stage.guard = () => 'the day has had its water';
    stage.lick(3);
    expect(stage.of('withheld').length).toBe(3);
    expect(stage.engine.view().rules[0]).toMatchObject({ firings: 0, withheld: 3 });
    stage.guard = () => undefined;
    stage.lick(3);
    expect(stage.firings().length).toBe(2);
  });

  test('the guard sees all outputs of a firing together', () => {
    const stage = new Stage(`
rules:
  both:
    when: lick
    do:
      - give 2 uL
      - pulse marker for 10 ms
      - pulse laser for 5 ms at 20 Hz, 10 times
`).lick();
    const [request] = stage.requests;
    expect(request!.orders).toEqual([
      {
        output: 0,
        volumeNl: 2000,
        widthUs: 32_000,
        periodUs: 0,
        repeats: 1,
        stoppable: false,
        delayUs: 0,
      },
      {
        output: 4,
        volumeNl: 0,
        widthUs: 10_000,
        periodUs: 0,
        repeats: 1,
        stoppable: false,
        delayUs: 0,
      },
      {
        output: 1,
        volumeNl: 0,
        widthUs: 5_000,
        periodUs: 50_000,
        repeats: 10,
        stoppable: false,
        delayUs: 0,
      },
    ]);
  });

  test('a withheld firing does no note and no change of phase either', () => {
    const stage = new Stage(`
rules:
  both:
    when: lick
    do:
      - note
      - give 2 uL
`);
    stage.guard = () => 'no';
    stage.lick();
    expect(stage.of('note')).toEqual([]);
  });

  test('what the board wholly refused is no firing: counts, limits and chance are as before', () => {
    const stage = new Stage(`
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
    limit: 2 per session, at least 2 laps apart
  seen:
    when: lap begins
    if: firings of water this session is 0 and firings of water over the last lap is 0
      and time since water fires > 1 h
    do: note
`);
    stage.outcome = 'not fired';
    stage.to(4, 0);
    expect(stage.laps('water')).toEqual([1, 2, 3]);
    expect(stage.laps('seen')).toEqual([2, 3, 4]);
    stage.outcome = 'fired';
    stage.to(9, 0);
    expect(stage.laps('water')).toEqual([1, 2, 3, 4, 6]);
  });

  test('a refusal that comes laps later takes it out of every scope it was counted in', () => {
    const stage = new Stage(`
phases:
  one: for 1 lap
  two: to the end
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  sum:
    when: reaches 100 cm
    if: firings of water this session is 2 and firings of water over the last lap is 1
      and firings of water this lap is 1 and firings of water this phase is 2
    do: note
`);
    stage.outcome = 'later';
    stage.to(1, 120);
    const first = stage.requests[0]!;
    stage.outcome = 'fired';
    stage.to(3, 10);
    stage.settle(first, 'not fired');
    stage.to(4, 0);
    expect(stage.laps('sum')).toEqual([3]);
  });

  test('nor does what the board refused use up a chance: it comes up again until it fires', () => {
    const stage = new Stage(
      'rules:\n  maybe:\n    when: lick\n    chance: 50 %\n    do: give 4 uL\n',
    );
    stage.outcome = 'not fired';
    stage.begin();
    while (stage.requests.length === 0) stage.lick().wait(100);
    for (let n = 0; n < 10; n++) stage.lick().wait(100);
    expect(stage.requests.length).toBe(11);
    expect(stage.engine.view().rules[0]!.firings).toBe(0);
  });

  test('what was never accounted for stays charged', () => {
    const stage = new Stage(`
rules:
  water:
    when: lick
    do: give 4 uL
    limit: 1 per session
`);
    stage.outcome = 'uncertain';
    stage.lick(3);
    expect(stage.firings().length).toBe(1);
    expect(stage.engine.view().rules[0]!.firings).toBe(1);
  });

  test('a chance has a stream of its own, and a withheld firing uses none of it', () => {
    const rules = `
rules:
  maybe:
    when: lick
    chance: 50 %
    do: give 4 uL
`;
    const plain = new Stage(rules).begin();
    for (let n = 0; n < 200; n++) plain.lick().wait(100);
    const share = plain.firings().length / 200;
    expect(share).toBeGreaterThan(0.35);
    expect(share).toBeLessThan(0.65);

    // Withheld once, then agreed: the same run of chances, one firing later each time.
    const stubborn = new Stage(rules);
    let asked = 0;
    stubborn.guard = () => (asked++ % 2 === 0 ? 'not yet' : undefined);
    let licks = 0;
    while (stubborn.firings().length + stubborn.of('withheld').length < 40) {
      stubborn.lick().wait(100);
      licks++;
    }
    const firstTwenty = plain.times('maybe')[19]!;
    const plainLicks = (firstTwenty - 10) / 110 + 1;
    expect(licks).toBe(plainLicks + 20);
  });
});

describe('sentence 15: sham', () => {
  const SHAM = `
rules:
  water:
    when: reaches 90 cm
    sham: lap is a multiple of 2
    do:
      - give 4 uL
      - note
    limit: 5 per session
  counts:
    when: lap begins
    if: real firings of water this session is 2 and sham firings of water this session is 1
      and firings of water this session is 3
    do: note
`;
  test('passes the guard, counts for the limits, drives nothing, and its notes happen', () => {
    const stage = new Stage(SHAM).to(9, 0);
    expect(stage.firings('water').map((d) => [d.what, d.lap])).toEqual([
      ['fired', 1],
      ['sham', 2],
      ['fired', 3],
      ['sham', 4],
      ['fired', 5],
    ]);
    expect(stage.requests.filter((r) => r.sham).length).toBe(2);
    expect(stage.of('note').filter((d) => d.name === 'water').length).toBe(5);
    expect(stage.laps('counts')).toEqual([4]);
  });

  test('a sham that the guard withholds is no firing', () => {
    const stage = new Stage(SHAM);
    stage.guard = (request) => (request.sham ? 'too much for today' : undefined);
    stage.to(5, 0);
    expect(stage.laps('water')).toEqual([1, 3]);
    expect(stage.of('withheld').length).toBe(2);
  });

  test('a sham does not stop an output', () => {
    const stage = new Stage(`
rules:
  hush:
    when: lick
    sham: licks this session is 1
    do: stop lamp
`).lick(2);
    expect(stage.of('stop').length).toBe(1);
  });
});

describe('sentence 16: limits', () => {
  function licksAllowed(limit: string, act: (stage: Stage) => void): Stage {
    const stage = new Stage(`
phases:
  one: for 2 laps
  two: to the end
rules:
  water:
    when: lick
    do: give 4 uL
    limit: ${limit}
`);
    act(stage);
    return stage;
  }

  test('per lap, per phase, per session', () => {
    const twice = (stage: Stage): void => {
      for (let lap = 1; lap <= 4; lap++) stage.to(lap, 20).lick(4).to(lap, 60).lick(4);
    };
    expect(licksAllowed('3 per lap', twice).laps('water')).toEqual([
      1, 1, 1, 2, 2, 2, 3, 3, 3, 4, 4, 4,
    ]);
    expect(licksAllowed('3 per phase', twice).laps('water')).toEqual([1, 1, 1, 3, 3, 3]);
    expect(licksAllowed('3 per session', twice).laps('water')).toEqual([1, 1, 1]);
    expect(licksAllowed('1 per lap, 2 per session', twice).laps('water')).toEqual([1, 2]);
  });

  test('`3 per 10 s` holds in any ten seconds', () => {
    const stage = licksAllowed('3 per 10 s', (s) => {
      s.begin();
      for (let n = 0; n < 100; n++) s.wait(490).lick();
    });
    const times = stage.times('water');
    expect(times.length).toBeGreaterThan(10);
    for (const ms of times) {
      expect(times.filter((t) => t > ms - 10_000 && t <= ms).length).toBeLessThanOrEqual(3);
    }
    // The window slides: a fourth comes as the first leaves it.
    expect(times[3]! - times[0]!).toBe(10_000);
  });

  test('`apart` is from one firing to the next, in time or laps', () => {
    const apart = licksAllowed('at least 5 s apart', (s) => s.begin().lick(21, 500));
    expect(apart.times('water')).toEqual([10, 5010, 10_010]);
    const laps = licksAllowed('at least 3 laps apart', (s) => {
      for (let lap = 1; lap <= 8; lap++) s.to(lap, 20).lick(2);
    });
    expect(laps.laps('water')).toEqual([1, 4, 7]);
  });
});

describe('sentence 17: within', () => {
  test('50 ms after the moment where nothing is said', () => {
    const stage = new Stage('rules:\n  water:\n    when: lick\n    do: give 4 uL\n').lick();
    const [request] = stage.requests;
    expect(request!.expiryUs - request!.causeUs).toBe(50_000);
    expect(request!.placeTravel).toBeNaN();
  });

  test('a time of its own', () => {
    const rules =
      'rules:\n  water:\n    when: spikes rises\n    do: give 4 uL\n    within: 20 ms\n';
    const stage = new Stage(rules).begin().input(2, true);
    const [request] = stage.requests;
    expect(request!.expiryUs - request!.causeUs).toBe(20_000);
  });

  test('a moment seen too late is missed, and recorded', () => {
    const stage = new Stage(
      'rules:\n  tick:\n    when: every 1 s\n    do: pulse lamp for 20 ms\n',
    ).begin();
    stage.wait(980);
    stage.instant.nowUs += 70_000;
    stage.frame(0);
    expect(stage.firings()).toEqual([]);
    expect(stage.of('missed').length).toBe(1);
    stage.wait(2000);
    expect(stage.firings().length).toBe(2);
  });

  test('a distance: further from the place it is missed', () => {
    const rules = `
rules:
  near:
    when: reaches 90 cm
    if: lap >= 1
    do:
      - pulse laser for 20 ms
      - note
    within: 1 cm
`;
    const close = new Stage(rules).to(1, 89.5);
    close.frame(1.4 * COUNTS_PER_CM);
    expect(close.firings('near').length).toBe(1);
    expect(close.requests[0]).toMatchObject({ placeTravel: LAP + 2250, withinCounts: 25 });
    const far = new Stage(rules).to(1, 89.5);
    far.frame(1.6 * COUNTS_PER_CM);
    expect(far.firings('near')).toEqual([]);
    expect(far.of('missed').length).toBe(1);
  });

  test('the cause of a crossing between two frames lies between them', () => {
    const stage = new Stage('rules:\n  water:\n    when: reaches 90 cm\n    do: give 4 uL\n', {
      frameMs: 20,
    });
    stage.to(1, 89);
    stage.frame(4 * COUNTS_PER_CM);
    const [request] = stage.requests;
    // A quarter of the way, so a quarter of the 20 ms.
    expect(stage.instant.nowUs - request!.causeUs).toBe(15_000);
  });
});

describe('trust', () => {
  const RULES = `
rules:
  light_here:
    when: reaches 50 cm
    do: pulse lamp for 20 ms
  water_here:
    when: reaches 60 cm
    do: give 4 uL
  mark_here:
    when: reaches 70 cm
    do: pulse sync for 10 ms
  light_anywhere:
    when: lick
    do: pulse lamp for 20 ms
  light_reading:
    when: lick
    if: not in 0 to 10 cm
    do: pulse laser for 20 ms
  water_anywhere:
    when: lick
    do: give 4 uL
`;
  function firedAt(trust: 'trusted' | 'doubtful' | 'unknown'): string[] {
    const stage = new Stage(RULES);
    stage.trust = trust;
    stage.to(1, 80).lick();
    return stage.firings().map((d) => d.name);
  }
  const anywhere = ['light_anywhere', 'water_anywhere'];

  test('trusted: everything', () => {
    expect(firedAt('trusted')).toEqual([
      'light_here',
      'water_here',
      'mark_here',
      'light_anywhere',
      'light_reading',
      'water_anywhere',
    ]);
  });
  test('doubtful: water yes, stimuli that name or read a place no', () => {
    expect(firedAt('doubtful')).toEqual(['water_here', 'mark_here', ...anywhere]);
  });
  test('unknown: only marks, and what neither names nor reads a place', () => {
    expect(firedAt('unknown')).toEqual(['mark_here', ...anywhere]);
  });
});
