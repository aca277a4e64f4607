import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { tickStep, xOf } from '../../dashboard/draw/axis.js';
import { boundsProblem, typedValue } from '../../dashboard/model/bounds.js';
import { bytesWords, clock, fixed } from '../../dashboard/model/format.js';
import { LAPS_KEPT, LapStore, MARK, MARKS_A_LAP, type Mark } from '../../dashboard/model/laps.js';
import { BINS, Profile } from '../../dashboard/model/profile.js';
import {
  STOP_ALARM_MS,
  stopAlarm,
  stopAsked,
  stopConfirmed,
  stopFailed,
  stopIdle,
} from '../../dashboard/model/stop.js';
import { SpeedTrace, TRACE_S } from '../../dashboard/model/trace.js';
import { shown } from '../../dashboard/model/units.js';

describe('the laps kept', () => {
  test('hold exactly what a plain list of the newest laps would, whatever comes', () => {
    const step = fc.record({
      ahead: fc.integer({ min: -3, max: 60 }),
      positionCm: fc.integer({ min: 0, max: 180 }),
      kind: fc.constantFrom<Mark>(...Object.values(MARK)),
    });
    fc.assert(
      fc.property(fc.array(step, { maxLength: 200 }), (steps) => {
        const store = new LapStore();
        const plain: { lap: number; positionCm: number; kind: number }[] = [];
        let newest = -1;
        for (const { ahead, positionCm, kind } of steps) {
          const lap = Math.max(0, newest + (ahead > 3 ? 0 : ahead) + (ahead > 50 ? ahead : 0));
          newest = Math.max(newest, lap);
          store.add(lap, positionCm, kind);
          plain.push({ lap, positionCm, kind });
        }
        expect(store.newest).toBe(newest);
        for (let lap = newest; lap > newest - LAPS_KEPT - 5; lap--) {
          const kept = lap > newest - LAPS_KEPT;
          const expected = kept ? plain.filter((one) => one.lap === lap) : [];
          const marks = store.get(lap);
          const found = Array.from({ length: marks?.count ?? 0 }, (_, n) => ({
            lap,
            positionCm: marks!.positionCm[n],
            kind: marks!.kind[n],
          }));
          expect(found).toEqual(expected);
        }
      }),
      { seed: 1, numRuns: 200 },
    );
  });

  test('count what they do not keep, and forget everything when cleared', () => {
    const store = new LapStore();
    for (let n = 0; n < MARKS_A_LAP + 50; n++) store.add(3, 10, MARK.lick);
    expect(store.get(3)!.count).toBe(MARKS_A_LAP);
    expect(store.get(3)!.totals[MARK.lick]).toBe(MARKS_A_LAP + 50);
    store.clear();
    expect(store.newest).toBe(-1);
    expect(store.get(3)).toBeUndefined();
    store.add(1, 20, MARK.water);
    expect(store.get(1)!.count).toBe(1);
  });
});

describe('the speed trace', () => {
  test('shows the last minute, oldest first, ending now, however much came before', () => {
    const trace = new SpeedTrace();
    for (let n = 0; n <= 10_000; n++) trace.add(n * 50_000, n % 100);
    const [time, speed] = trace.view();
    expect(time.length).toBe((TRACE_S * 1000) / 50 + 1);
    expect(time.at(-1)).toBe(0);
    expect(time[0]).toBeCloseTo(-TRACE_S, 6);
    for (let n = 1; n < time.length; n++) expect(time[n]).toBeGreaterThan(time[n - 1]!);
    expect(speed.at(-1)).toBe(0);
    expect(speed.at(-2)).toBe(99);
  });

  test('a board that stands still adds nothing; one whose time went back begins anew', () => {
    const trace = new SpeedTrace();
    trace.add(5_000_000, 1);
    trace.add(5_000_000, 1);
    expect(trace.view()[0].length).toBe(1);
    trace.add(1_000_000, 2);
    expect([...trace.view()[1]]).toEqual([2]);
  });
});

describe('speed and licks by position', () => {
  test('the first ten laps and the last ten are kept apart, older ones fall out', () => {
    const profile = new Profile();
    for (let lap = 1; lap <= 40; lap++) {
      profile.addSpeed(lap, 0.5, lap);
      profile.addLick(lap, 0.5);
    }
    const out = new Float64Array(BINS);
    profile.speedInto(out, 'early');
    expect(out[BINS / 2]).toBeCloseTo(5.5, 9);
    profile.speedInto(out, 'recent');
    expect(out[BINS / 2]).toBeCloseTo(35.5, 9);
    expect(out[0]).toBeNaN();
    profile.licksInto(out, 'recent');
    expect(out[BINS / 2]).toBeCloseTo(1, 9);
    expect(profile.comparable).toBe(true);
  });

  test('with fewer than ten laps there is nothing to compare with', () => {
    const profile = new Profile();
    for (let lap = 1; lap <= 4; lap++) profile.addLick(lap, 0.999);
    const out = new Float64Array(BINS);
    profile.licksInto(out, 'early');
    expect(out[BINS - 1]).toBeCloseTo(1, 9);
    profile.licksInto(out, 'recent');
    expect(out.every((one) => one === 0)).toBe(true);
    expect(profile.comparable).toBe(false);
  });
});

describe('stop everything', () => {
  test('is confirmed by nothing but a confirmation, and shouts when it takes long or fails', () => {
    let stop = stopAsked(stopIdle, 1000);
    expect(stopAlarm(stop, 1000 + STOP_ALARM_MS)).toBe(false);
    expect(stopAlarm(stop, 1001 + STOP_ALARM_MS)).toBe(true);
    stop = stopFailed(stop, 'The service cannot be reached.');
    expect(stopAlarm(stop, 1000)).toBe(true);
    stop = stopAsked(stop, 2000);
    expect(stop).toMatchObject({ is: 'asking', tries: 2, sinceMs: 1000 });
    stop = stopConfirmed(stop, 2500, '12:00:01');
    expect(stop).toEqual({ is: 'confirmed', at: '12:00:01', afterMs: 1500 });
    expect(stopAlarm(stop, 99_999)).toBe(false);
    // A late failure of the first try takes nothing back, and none is made from nothing.
    expect(stopFailed(stop, 'late')).toBe(stop);
    expect(stopConfirmed(stopIdle, 1, 'x')).toBe(stopIdle);
  });
});

describe('bounds of a choice', () => {
  const target = { name: 'target', unit: 'nL', least: 1000, most: 8000 };
  test.each([
    ['1', ''],
    ['8', ''],
    ['4.5', ''],
    ['0.999', 'At least 1 µL.'],
    ['8.01', 'At most 8 µL.'],
    ['', 'A number is wanted.'],
    ['1e999', 'A number is wanted.'],
    ['four', 'A number is wanted.'],
  ])('%j: %j', (draft, problem) => {
    expect(boundsProblem(target, draft)).toBe(problem);
  });

  test('on a step, where the file says steps', () => {
    const stepped = { name: 'target', unit: 'cm', least: 20, most: 140, step: 2.5 };
    expect(boundsProblem(stepped, '22.5')).toBe('');
    expect(boundsProblem(stepped, '23')).toBe('In steps of 2.5 cm from 20.');
  });

  test('what is typed in the shown unit is sent in the base unit, without a rounding of its own', () => {
    expect(typedValue({ unit: 'nL' }, '4.1')).toBe(4100);
    expect(typedValue({ unit: 'us' }, '0.3')).toBe(300);
    expect(typedValue({ unit: 'cm' }, '45.1')).toBe(45.1);
    expect([shown(4100, 'nL'), shown(5000, 'us'), shown(45, 'cm'), shown('short', '')]).toEqual([
      ...[4.1, 5, 45],
      'short',
    ]);
  });

  test('only the options offered', () => {
    const train = { name: 'train', unit: '', options: ['short', 5] };
    expect(boundsProblem(train, '5')).toBe('');
    expect(boundsProblem(train, 'long')).not.toBe('');
  });
});

describe('numbers and axes', () => {
  test('are shown with a fixed width, a true minus and no negative zero', () => {
    expect(fixed(-0.04, 1)).toBe('0.0');
    expect(fixed(-3.26, 1)).toBe('−3.3');
    expect(fixed(null, 1)).toBe('–');
    expect(fixed(Number.NaN, 1)).toBe('–');
    expect([clock(-1), clock(59.9), clock(725), clock(3729)]).toEqual([
      '0:00',
      '0:59',
      '12:05',
      '1:02:09',
    ]);
    expect([bytesWords(900), bytesWords(2.5e6), bytesWords(3.21e9)]).toEqual([
      '1 kB',
      '2.5 MB',
      '3.21 GB',
    ]);
  });

  test('ticks are 1, 2 or 5 times a power of ten and never too many', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 1e5, noNaN: true }),
        fc.integer({ min: 1, max: 20 }),
        (length, most) => {
          const step = tickStep(length, most);
          expect(length / step).toBeLessThanOrEqual(most + 1e-9);
          const lead = step / 10 ** Math.floor(Math.log10(step) + 1e-9);
          expect([1, 2, 5].some((one) => Math.abs(lead - one) < 1e-6)).toBe(true);
        },
      ),
      { seed: 2 },
    );
  });

  test('the belt begins and ends where its axis does', () => {
    const scale = (xOf(180, 180, 1000) - xOf(0, 180, 1000)) / 180;
    expect(xOf(90, 180, 1000)).toBeCloseTo(xOf(0, 180, 1000) + 90 * scale, 9);
  });
});
