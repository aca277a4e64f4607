import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { LAP, Stage } from './stage.js';

/** A frame of any animal: trembling, running, turning back, licking, and the seam mark's word. */
const wild = fc.record({
  step: fc.oneof(
    fc.integer({ min: -3, max: 3 }),
    fc.integer({ min: 0, max: 200 }),
    fc.integer({ min: -120, max: 60 }),
    fc.integer({ min: 0, max: 900 }),
  ),
  lick: fc.boolean(),
  spike: fc.boolean(),
  /** A correction in cm, seldom. In whole millimetres, since random doubles are mostly tiny. */
  correction: fc.oneof(
    { weight: 10, arbitrary: fc.constant(0) },
    { weight: 1, arbitrary: fc.integer({ min: -25, max: 25 }).map((mm) => mm / 10) },
  ),
  trust: fc.constantFrom('trusted', 'trusted', 'trusted', 'doubtful') as fc.Arbitrary<
    'trusted' | 'doubtful'
  >,
  agree: fc.boolean(),
  outcome: fc.constantFrom('fired', 'fired', 'not fired', 'uncertain') as fc.Arbitrary<
    'fired' | 'not fired' | 'uncertain'
  >,
  act: fc.constantFrom('', '', '', '', '', '', 'press', 'choose', 'cell', 'next'),
});
type Wild = typeof wild extends fc.Arbitrary<infer T> ? T : never;
const walk = fc.array(wild, { minLength: 50, maxLength: 400 });

function follow(stage: Stage, steps: readonly Wild[], each?: (step: Wild) => void): void {
  stage.begin();
  for (const step of steps) {
    if (step.lick) stage.lickAtNextFrame();
    stage.inputAtNextFrame(2, step.spike);
    if (step.correction !== 0) stage.correct(step.correction);
    stage.trust = step.trust;
    stage.guard = () => (step.agree ? undefined : 'the guard said no');
    stage.outcome = step.outcome;
    if (step.act === 'press') stage.engine.press('more');
    if (step.act === 'choose') stage.engine.choose('where', 20 + (Math.abs(step.step) % 120));
    if (step.act === 'cell') stage.engine.newCell();
    if (step.act === 'next') stage.engine.goTo('next');
    stage.frame(step.step);
    each?.(step);
  }
}

const EVERYTHING = `
operator:
  where: 20 to 140 cm, at first 45 cm
draws:
  kind: stim or sham, every firing of light, in shuffled blocks of 4, at most 3 in a row
  spot: 20 to 160 cm, every lap, at least 40 cm from the last
  wait: 20 to 90 ms, every firing of tick
places:
  zone: where to where + 20 cm
phases:
  one: for 2 laps
  two: until share of licks in zone over the last lap > 20 %, at lap end
  three: for 10 laps or 5 s
rules:
  water:
    when: reaches spot
    do: give 4 uL
    limit: 2 per 500 ms, 6 per session
  light:
    when: enters zone
    if: speed > 1 cm/s and not (phase is two)
    chance: 80 %
    sham: kind is sham
    do: pulse laser for 5 ms at 20 Hz while in zone, up to 300 ms
    limit: 1 per lap, 5 per phase
  out:
    when: 30 ms after leaves zone
    do:
      - note
      - after 20 ms, pulse tone for 20 ms
    limit: 3 per cell
  extra:
    when: operator presses more
    do: give 2 uL
    limit: at least 100 ms apart, at least 2 laps apart
  tick:
    when: every wait
    do: pulse sync for 10 ms
  follow:
    when: water fires
    if: mean speed over the last 200 ms > 0 cm/s
    do: pulse lamp for 20 ms
`;

describe('the engine is deterministic', () => {
  test('the same inputs give the same commands and the same record', () => {
    fc.assert(
      fc.property(walk, fc.string(), fc.boolean(), (steps, seed, slots) => {
        const run = (): unknown => {
          const stage = new Stage(EVERYTHING, { seed });
          stage.slots = slots;
          follow(stage, steps);
          return [stage.deeds, stage.requests, stage.engine.view()];
        };
        expect(run()).toEqual(run());
      }),
      { seed: 11, numRuns: 60, endOnFailure: true },
    );
  });
});

describe('no rule exceeds its limit', () => {
  test('on any path, with any answers of the guard and the board', () => {
    let firings = 0;
    fc.assert(
      fc.property(walk, fc.string(), fc.boolean(), (steps, seed, slots) => {
        const stage = new Stage(EVERYTHING, { seed });
        stage.slots = slots;
        // Firings that count: agreed to and not refused, with where they fell.
        const counted: { name: string; ms: number; lap: number; phase: number; cell: number }[] =
          [];
        let told = 0;
        let phase = 0;
        let cell = 0;
        follow(stage, steps, (step) => {
          for (const deed of stage.deeds.slice(told)) {
            if (deed.what === 'phase') phase++;
            if (deed.what === 'cell') cell++;
            // What `out` drives comes later than its firing; its note comes with it.
            if (deed.name === 'out' && deed.what !== 'note') continue;
            const real = deed.what === 'fired' && step.outcome !== 'not fired';
            const note = deed.name === 'out' && deed.what === 'note';
            const board =
              deed.what === 'fired' &&
              !stage.requests.some(
                (r) => stage.rule(r.rule) === deed.name && r.serial === deed.value,
              );
            if (deed.what === 'sham' || real || note || board) {
              counted.push({ ...deed, phase, cell });
            }
          }
          told = stage.deeds.length;
        });
        firings += counted.length;
        const of = (name: string) => counted.filter((f) => f.name === name);
        const most = (name: string, key: (f: (typeof counted)[0]) => number): number => {
          const groups = new Map<number, number>();
          for (const f of of(name)) groups.set(key(f), (groups.get(key(f)) ?? 0) + 1);
          return Math.max(0, ...groups.values());
        };
        expect(most('water', () => 0)).toBeLessThanOrEqual(6);
        for (const f of of('water')) {
          const lately = of('water').filter((g) => g.ms > f.ms - 500 && g.ms <= f.ms);
          expect(lately.length).toBeLessThanOrEqual(2);
        }
        expect(most('light', (f) => f.lap)).toBeLessThanOrEqual(1);
        expect(most('light', (f) => f.phase)).toBeLessThanOrEqual(5);
        expect(most('out', (f) => f.cell)).toBeLessThanOrEqual(3);
        const extra = of('extra');
        for (let n = 1; n < extra.length; n++) {
          expect(extra[n]!.ms - extra[n - 1]!.ms).toBeGreaterThanOrEqual(100);
          expect(extra[n]!.lap - extra[n - 1]!.lap).toBeGreaterThanOrEqual(2);
        }
      }),
      { seed: 12, numRuns: 150, endOnFailure: true },
    );
    expect(firings).toBeGreaterThan(500);
  });
});

describe('reaches', () => {
  const REACH = `
rules:
  start_mark:
    when: reaches 0 cm
    do: note
  spot:
    when: reaches 90 cm
    do: note
  last_mark:
    when: reaches 179.96 cm
    do: note
`;
  test('comes exactly once a lap for any path: trembling, turning back, over the seam both ways', () => {
    fc.assert(
      fc.property(walk, (steps) => {
        const stage = new Stage(REACH);
        follow(
          stage,
          steps.map((step) => ({ ...step, correction: 0 })),
        );
        const furthest = stage.instant.progressTo;
        for (const [name, place] of [
          ['start_mark', 0],
          ['spot', 2250],
          ['last_mark', 4499],
        ] as const) {
          const expected: number[] = [];
          for (let lap = 1; lap * LAP + place <= furthest; lap++) expected.push(lap);
          // A lap is known by the place in it: the frame that passes it may end in the next one.
          expect([
            name,
            stage.firings(name).length + stage.of('missed').filter((d) => d.name === name).length,
          ]).toEqual([name, expected.length]);
        }
      }),
      { seed: 13, numRuns: 150, endOnFailure: true },
    );
  });

  test('comes once a lap or is missed once when the seam mark corrects, never both or twice', () => {
    const places = Array.from({ length: 17 }, (_, n) => 10 + 10 * n);
    const rules = places.map((cm) => `  p${cm}:\n    when: reaches ${cm} cm\n    do: note\n`);
    let jumped = 0;
    fc.assert(
      fc.property(walk, (steps) => {
        const stage = new Stage(`rules:\n${rules.join('')}`);
        follow(
          stage,
          // Mostly forwards, so that the animal is at its furthest when the mark corrects.
          steps.map((step, n) => {
            const counts = Math.min(step.step, 100);
            return { ...step, step: n % 4 === 0 ? counts : Math.abs(counts) };
          }),
        );
        const laps = Math.floor(stage.instant.progressTo / LAP);
        const into = (stage.instant.progressTo - laps * LAP) / 25;
        for (const cm of places) {
          const all = stage.deeds.filter((d) => d.name === `p${cm}`);
          const missed = all.filter((d) => d.what === 'missed').length;
          jumped += missed;
          const come = missed + all.filter((d) => d.what === 'fired').length;
          // A place just behind may have been passed before a correction took the animal back.
          expect(come).toBeGreaterThanOrEqual(into >= cm ? laps : laps - 1);
          expect(come).toBeLessThanOrEqual(laps);
        }
      }),
      { seed: 14, numRuns: 150, endOnFailure: true },
    );
    expect(jumped).toBeGreaterThan(20);
  });
});

describe('enters and leaves', () => {
  test('alternate, whatever the path, and corrections never make one come twice', () => {
    fc.assert(
      fc.property(walk, (steps) => {
        const stage = new Stage(`
rules:
  into:
    when: enters 85 to 95 cm
    do: note
  out:
    when: leaves 85 to 95 cm
    do: note
`);
        follow(
          stage,
          steps.map((step) => ({ ...step, correction: 0 })),
        );
        const names = stage.of('note').map((d) => d.name);
        // Two crossings in one frame are told rule by rule: the file's order, in before out.
        for (let n = 0; n < names.length; n += 2) {
          const pair = names.slice(n, n + 2).sort();
          expect(['into', 'out']).toEqual(expect.arrayContaining(pair));
          expect(new Set(pair).size).toBe(pair.length);
        }
      }),
      { seed: 15, numRuns: 150, endOnFailure: true },
    );
  });
});

describe('arming', () => {
  test('a place fires once a lap at most, whichever of host and board does it', () => {
    let byBoard = 0;
    fc.assert(
      fc.property(walk, (steps) => {
        const stage = new Stage(`
rules:
  light:
    when: reaches 90 cm
    if: speed > 3 cm/s
    do: pulse laser for 20 ms
`);
        stage.slots = true;
        follow(stage, steps, (step) => {
          stage.boardFires = step.agree;
        });
        const places = new Map<number, number>();
        for (const deed of stage.firings('light')) {
          const lap = Math.floor((stage.travelAt(deed) - 2250 + LAP / 2) / LAP);
          places.set(lap, (places.get(lap) ?? 0) + 1);
        }
        for (const count of places.values()) expect(count).toBe(1);
        byBoard += stage.firings('light').length - stage.requests.length;
      }),
      { seed: 16, numRuns: 150, endOnFailure: true },
    );
    expect(byBoard).toBeGreaterThan(20);
  });
});
