import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { compile } from '../../server/rules/engine/compile.js';
import { History } from '../../server/rules/engine/history.js';
import { RulesEngine } from '../../server/rules/engine/rulesEngine.js';
import { SpanTracker } from '../../server/rules/engine/spanTracker.js';
import { FACTS, rulesOf, Stage } from './stage.js';

describe('rules that wait for a place cost nothing where nothing near them happens', () => {
  /** How often the instant is read in a frame at 20 cm, with so many rules at 90 cm and on. */
  function readsPerFrame(rules: number): number {
    const text = Array.from({ length: rules }, (_, n) => {
      return `  r${n}:\n    when: reaches ${90 + (n % 80)} cm\n    if: speed >= 8 cm/s and position > 1 cm\n    do: give 4 uL\n`;
    });
    const stage = new Stage(`rules:\n${text.join('')}`).to(1, 20);
    let reads = 0;
    const counted = new Proxy(stage.instant, {
      get(target, key) {
        reads++;
        return Reflect.get(target, key);
      },
    });
    counted.nowUs += 10_000;
    counted.travelFrom = counted.travelTo;
    counted.progressFrom = counted.progressTo;
    reads = 0;
    stage.engine.step(counted);
    return reads;
  }

  test('a hundred look at no more of a frame than one does', () => {
    expect(readsPerFrame(1)).toBeGreaterThan(5);
    expect(readsPerFrame(100)).toBe(readsPerFrame(1));
  });
});

describe('what is remembered', () => {
  test('a history tells the total at any time within its window', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.integer({ min: 0, max: 50 }), fc.integer({ min: 0, max: 5 })), {
          maxLength: 300,
        }),
        fc.integer({ min: 1, max: 400 }),
        (entries, windowUs) => {
          const history = new History(windowUs, 0);
          history.push(0, 0);
          const all: [number, number][] = [[0, 0]];
          let timeUs = 0;
          let total = 0;
          for (const [later, more] of entries) {
            timeUs += later;
            total += more;
            history.push(timeUs, total);
            all.push([timeUs, total]);
            for (const back of [0, windowUs / 2, windowUs]) {
              const expected = all.findLast(([at]) => at <= timeUs - back)?.[1] ?? 0;
              expect(history.at(timeUs - back)).toBe(expected);
            }
          }
        },
      ),
      { seed: 21, numRuns: 200, endOnFailure: true },
    );
  });

  test('stays within what the window needs, however long the session', () => {
    const history = new History(1_000_000, 0);
    for (let ms = 0; ms < 1_000_000; ms++) history.push(ms * 1000, ms);
    // A thousand entries lie in a second; the ring holds the next power of two.
    const { times } = history as unknown as { times: Float64Array };
    expect(times.length).toBe(1024);
  });

  test('entries closer than the least gap are merged', () => {
    const history = new History(3_600_000_000, 54_931);
    for (let ms = 0; ms < 4_000_000; ms++) history.push(ms * 1000, ms);
    const { times } = history as unknown as { times: Float64Array };
    expect(times.length).toBeLessThanOrEqual(131_072);
    const then = history.at(3_999_999_000 - 3_600_000_000);
    expect(then).toBeGreaterThan(399_999 - 120);
    expect(then).toBeLessThanOrEqual(399_999);
  });
});

describe('a span', () => {
  const path = fc.array(
    fc.oneof(fc.integer({ min: -30, max: 30 }), fc.integer({ min: -2000, max: 3000 })),
    { maxLength: 80 },
  );
  const where = fc.tuple(fc.integer({ min: 0, max: 4499 }), fc.integer({ min: 1, max: 4500 }));

  test('gives the same crossings for a path in strides and count by count', () => {
    fc.assert(
      fc.property(path, where, (strides, [start, length]) => {
        const whole = new SpanTracker();
        const fine = new SpanTracker();
        for (const tracker of [whole, fine]) tracker.locate(start, length, 4500, 13, 4500);
        const seen: [string[], string[]] = [[], []];
        let travel = 4500;
        for (const stride of strides) {
          const to = travel + stride;
          take(whole, to, seen[0]);
          for (let at = travel; at !== to; at += Math.sign(stride)) {
            take(fine, at + Math.sign(stride), seen[1]);
          }
          travel = to;
        }
        expect(seen[0]).toEqual(seen[1]);
      }),
      { seed: 22, numRuns: 100, endOnFailure: true },
    );
  });

  function take(tracker: SpanTracker, travel: number, seen: string[]): void {
    for (let event = tracker.next(travel); event !== 0; event = tracker.next(travel)) {
      seen.push(`${event} ${tracker.crossedTravel} ${tracker.forwards}`);
    }
  }

  test('away from its edges by the hysteresis, it knows whether the animal is inside', () => {
    fc.assert(
      fc.property(path, where, (strides, [start, length]) => {
        const tracker = new SpanTracker();
        tracker.locate(start, length, 4500, 13, 4500);
        let inside = (((4500 - start) % 4500) + 4500) % 4500 < length;
        let travel = 4500;
        for (const stride of strides) {
          travel += stride;
          for (let event = tracker.next(travel); event !== 0; event = tracker.next(travel)) {
            inside = event > 0;
          }
          const into = (((travel - start) % 4500) + 4500) % 4500;
          const clear = [0, length, 4500].every((edge) => Math.abs(into - edge) > 13);
          if (clear) expect(inside).toBe(into < length);
        }
      }),
      { seed: 23, numRuns: 200, endOnFailure: true },
    );
  });
});

describe('what a dashboard shows', () => {
  test('places as they are now, under the name that the file gives them', () => {
    const stage = new Stage(`
operator:
  light_at: 20 to 140 cm, at first 45 cm
draws:
  water_at: 20 to 160 cm, every lap
  wait: 1 to 3 s, every lap
places:
  lit: light_at to light_at + 30 cm
rules:
  light:
    when: enters lit
    do: pulse laser for 5 ms
  water:
    when: reaches water_at
    do: give 4 uL
  late:
    when: wait after reaches 150 cm
    do: note
  seam:
    when: leaves 170 to 10 cm
    do: note
`).begin();
    const names = (): string[] => stage.engine.view().places.map((p) => p.name);
    expect(names()).toEqual(['lit', 'light_at', 'late', 'seam']);
    stage.to(1, 5);
    expect(names()).toEqual(['lit', 'water_at', 'light_at', 'late', 'seam']);
    const { places, rules } = stage.engine.view();
    expect(places[0]).toEqual({ name: 'lit', fromCm: 45, toCm: 75 });
    expect(places.at(-1)).toEqual({ name: 'seam', fromCm: 170, toCm: 10 });
    expect(rules.map((r) => r.name)).toEqual(['light', 'water', 'late', 'seam']);
  });

  test('before the session begins nothing has happened yet', () => {
    const file = rulesOf('rules:\n  water:\n    when: lick\n    do: give 4 uL\n');
    const engine = new RulesEngine(compile(file, FACTS), 'seed', stageless, stageless);
    expect(engine.view()).toMatchObject({ phase: null, places: [], cell: 0 });
    expect(engine.choose('anything', 1)).toBe(false);
    engine.press('anything');
    engine.drop(4000);
  });
  const stageless = new Stage('rules:\n  water:\n    when: lick\n    do: give 4 uL\n');
});
