import { describe, expect, test } from 'vitest';
import { ageWords, freshness, noteAwake, STALE_MS } from '../../dashboard/model/freshness.js';
import { healthOf } from '../../dashboard/model/health.js';
import { LAPS_KEPT, MARK } from '../../dashboard/model/laps.js';
import { EVENTS_KEPT, emptyLive, type Live, outputKind, take } from '../../dashboard/model/live.js';
import { actWords, eventWords } from '../../dashboard/model/words.js';
import type { NumberedEvent } from '../../server/loop/protocol.js';
import type { Decision } from '../../server/session/decisions.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';

/** A page that has watched the scripted animal for a while. */
function watch(seconds: number): { live: Live; animal: ScriptedAnimal; nowMs: number } {
  const animal = new ScriptedAnimal();
  const live = emptyLive();
  live.stream = 'open';
  animal.begin('induction.yaml', 'M12');
  let nowMs = 0;
  take(live, { tell: 'loop', state: 'up', life: 'a', reason: '', remedy: '' }, nowMs);
  take(live, { tell: 'setup', setup: structuredClone(animal.setup) }, nowMs);
  for (let at = 0; at < seconds; at += 0.05) {
    animal.advance(0.05);
    nowMs += 50;
    tell(live, animal, nowMs);
  }
  return { live, animal, nowMs };
}

function tell(live: Live, animal: ScriptedAnimal, nowMs: number): void {
  take(live, { tell: 'events', events: animal.events.splice(0) }, nowMs);
  take(live, { tell: 'state', state: structuredClone(animal.state) }, nowMs);
  noteAwake(live, nowMs);
}

function event(number: number, decision: Decision, lap = 1): NumberedEvent {
  const stamp = { input: 0, boardUs: number * 1e6, lap, positionCm: 20, speedCmPerS: 9 };
  return { number, event: { ...stamp, ...decision } };
}

describe('what the page knows', () => {
  test('agrees with the animal about laps, licks and firings', () => {
    const { live, animal } = watch(200);
    const { state } = animal;
    expect(live.state?.lap).toBe(state.lap);
    expect(live.laps.newest).toBe(state.lap);
    expect(state.lap).toBeLessThan(LAPS_KEPT);
    const total = (kind: number) => {
      let sum = 0;
      for (let lap = 0; lap <= state.lap; lap++) sum += live.laps.get(lap)?.totals[kind] ?? 0;
      return sum;
    };
    const rule = (name: string) => state.rules.find((one) => one.name === name)!;
    expect(total(MARK.lick)).toBe(state.licks);
    expect(total(MARK.water)).toBe(rule('water').firings);
    expect(total(MARK.stimulus)).toBe(rule('induce').firings);
    expect(total(MARK.sham)).toBe(rule('induce').shams);
    expect(total(MARK.missed)).toBe(rule('induce').missed);
    expect(live.unseen).toBe(0);
  });

  test('keeps a bounded list of events and lists no licks', () => {
    const { live } = watch(1200);
    expect(live.events.length).toBe(EVENTS_KEPT);
    expect(live.events.some((one) => one.event.kind === 'lick')).toBe(false);
  });

  test('counts what was never sent, whether told as a gap or seen by the numbers', () => {
    const live = emptyLive();
    take(live, { tell: 'events', events: [event(5, { kind: 'lick', artefact: false })] }, 0);
    take(live, { tell: 'gap', from: 6, to: 9 }, 0);
    take(live, { tell: 'events', events: [event(10, { kind: 'lick', artefact: false })] }, 0);
    take(live, { tell: 'events', events: [event(13, { kind: 'lick', artefact: false })] }, 0);
    expect(live.unseen).toBe(6);
  });

  test('a session after the first starts with an empty raster, by its event or its setup', () => {
    const byEvent = watch(60);
    const began: Decision = { kind: 'session began', title: 'next', seed: '1' };
    const number = byEvent.live.lastEvent + 1;
    take(byEvent.live, { tell: 'events', events: [event(number, began, 0)] }, 0);
    expect(byEvent.live.laps.newest).toBe(-1);
    expect(byEvent.live.events).toHaveLength(1);

    const bySetup = watch(60);
    const setup = structuredClone(bySetup.animal.setup);
    take(bySetup.live, { tell: 'setup', setup }, 0);
    expect(bySetup.live.laps.newest).toBeGreaterThan(0);
    const next = { ...setup, session: { ...setup.session!, startedAt: 'later' } };
    take(bySetup.live, { tell: 'setup', setup: next }, 0);
    expect(bySetup.live.laps.newest).toBe(-1);
  });

  test('a loop that begins anew replaces what was shown; one that was only away does not', () => {
    const { live } = watch(60);
    const { newest } = live.laps;
    const last = live.lastEvent;
    const lost = { tell: 'loop', state: 'away', life: 'a', reason: '', remedy: '' } as const;
    take(live, lost, 0);
    take(live, { ...lost, state: 'up' }, 0);
    take(live, { ...lost, life: '' }, 0);
    expect(live.laps.newest).toBe(newest);
    // Told twice, counted once.
    take(live, { tell: 'events', events: [event(last, { kind: 'lick', artefact: false }, 90)] }, 0);
    expect(live.laps.newest).toBe(newest);
    take(live, { ...lost, state: 'up', life: 'b' }, 0);
    take(live, { tell: 'events', events: [event(1, { kind: 'lap began', lap: 1 })] }, 0);
    expect(live.laps.newest).toBe(1);
    expect(live.lastEvent).toBe(1);
    expect(live.unseen).toBe(0);
  });

  test('a firing is marked where the output rose; a sync line, or a rule that drives nothing, is not', () => {
    const { live } = watch(1);
    const fired = { kind: 'fired', rule: 'r', serial: 1, sham: false, armed: true } as const;
    const at = { riseUs: 1, placeCm: 45, riseCm: 45.5, errorMm: 5 };
    const start = live.lastEvent;
    const tellFired = (number: number, output: string | null, sham = false) =>
      take(
        live,
        { tell: 'events', events: [event(start + number, { ...fired, ...at, output, sham }, 9)] },
        0,
      );
    tellFired(1, 'gate');
    tellFired(2, 'sync');
    tellFired(3, 'valve');
    tellFired(4, null, true);
    tellFired(5, null);
    const marks = live.laps.get(9)!;
    expect([...marks.kind.slice(0, marks.count)]).toEqual([MARK.stimulus, MARK.water, MARK.sham]);
    expect(marks.positionCm[0]).toBeCloseTo(45.5, 4);
  });
});

describe('staleness', () => {
  test('names the nearest part that is missing, and how old everything is', () => {
    const { live, animal, nowMs } = watch(10);
    expect(freshness(live, nowMs + STALE_MS).fresh).toBe(true);
    const still = freshness(live, nowMs + STALE_MS + 1);
    expect(still).toMatchObject({ fresh: false, why: 'Board time stands still' });
    expect(still.ageMs).toBe(STALE_MS + 1);

    const link = {
      ...animal.state.link,
      state: 'down' as const,
      reason: 'pulled',
      remedy: 'Plug.',
    };
    take(live, { tell: 'state', state: { ...animal.state, link } }, nowMs + 5000);
    expect(freshness(live, nowMs + 5000)).toMatchObject({
      why: 'The board is lost: pulled',
      remedy: 'Plug.',
      ageMs: 5000,
    });
    take(live, { tell: 'loop', state: 'away', life: 'a', reason: 'x', remedy: 'y' }, nowMs + 6000);
    expect(freshness(live, nowMs + 6000).why).toBe('The loop is away');
    live.stream = 'lost';
    expect(freshness(live, nowMs + 6000).why).toBe('No connection to the service');
  });

  test('a state that repeats the same board time does not make it fresh', () => {
    const { live, animal, nowMs } = watch(10);
    for (let n = 1; n <= 60; n++) {
      take(live, { tell: 'state', state: { ...animal.state } }, nowMs + n * 50);
      noteAwake(live, nowMs + n * 50);
    }
    expect(freshness(live, nowMs + 3000).fresh).toBe(false);
  });

  test('a page that was itself held up gives what waited a moment, but never long', () => {
    const { live, nowMs } = watch(10);
    noteAwake(live, nowMs + 2000);
    expect(freshness(live, nowMs + 2100).fresh).toBe(true);
    noteAwake(live, nowMs + 2200);
    expect(freshness(live, nowMs + 2301).fresh).toBe(false);
    noteAwake(live, nowMs + 60_000);
    expect(freshness(live, nowMs + 60_000).fresh).toBe(false);
  });

  test('before anything came, nothing is called fresh', () => {
    const live = emptyLive();
    expect(freshness(live, 10)).toMatchObject({ fresh: false, why: 'Connecting to the service' });
    live.stream = 'open';
    expect(freshness(live, 10).why).toBe('No word from the loop yet');
    expect([Number.NaN, 900, 61_000, 500_000, 8e6].map(ageWords)).toEqual([
      'never',
      '0.9 s',
      '61 s',
      '8 min',
      '2 h',
    ]);
  });
});

describe('health', () => {
  const levels = (live: Live) => healthOf(live).map((one) => `${one.what} ${one.level}`);

  test('is good all the way down while all is well', () => {
    const { live } = watch(30);
    expect(levels(live)).toEqual([
      'Page good',
      'Loop good',
      'Board good',
      'Position good',
      'Record good',
    ]);
  });

  test('shows each fault where it is', () => {
    const { live, animal } = watch(30);
    const { state } = animal;
    const link = { ...state.link, lostFrames: 2 };
    const record = { ...state.record, state: 'failed' as const, reason: 'disk full' };
    const bad = { ...state, link, record, trust: 'doubtful' as const };
    take(live, { tell: 'state', state: bad }, 0);
    expect(levels(live).slice(2)).toEqual(['Board warn', 'Position warn', 'Record bad']);
    expect(healthOf(live).at(-1)!.detail).toBe('disk full');
    take(live, { tell: 'loop', state: 'away', life: 'a', reason: 'killed', remedy: 'wait' }, 0);
    expect(healthOf(live)[1]).toMatchObject({ level: 'bad', word: 'away', remedy: 'wait' });
    const low = { ...state.record, diskFreeGb: 2 };
    take(live, { tell: 'state', state: { ...state, record: low } }, 0);
    expect(healthOf(live).at(-1)!.level).toBe('warn');
  });
});

describe('events in words', () => {
  test('every event that the animal makes has a sentence of its own', () => {
    const animal = new ScriptedAnimal();
    animal.begin('induction.yaml', 'M12');
    animal.advance(300);
    for (const { event } of animal.events) {
      const { text } = eventWords(event);
      expect(text.length).toBeGreaterThan(3);
      expect(text).not.toMatch(/undefined|null|NaN|\[object/);
    }
  });

  test('say where, how far off and by whom; water and stimulus differ in tone', () => {
    const { live } = watch(1);
    const fired = {
      ...event(1, {
        kind: 'fired',
        rule: 'induce',
        serial: 1,
        sham: false,
        armed: true,
        output: 'gate',
        riseUs: 5,
        placeCm: 45,
        riseCm: 45.06,
        errorMm: 0.6,
      }).event,
    };
    const kindOf = (output: string | null) => outputKind(live, output);
    expect(eventWords(fired, kindOf)).toEqual({
      text: 'induce fired (gate) at 45.1 cm, 0.6 mm off, by the board',
      tone: 'stim',
    });
    const water = { ...fired, output: 'valve', rule: 'water', armed: false };
    expect(eventWords(water, kindOf).tone).toBe('water');
    expect(eventWords(water, kindOf).text).toContain('by the host');
    const told = (decision: Decision) => eventWords(event(2, decision).event).text;
    expect(told({ kind: 'withheld', rule: 'induce', serial: 2, reason: 'duty' })).toBe(
      'induce was withheld: duty',
    );
    expect(told({ kind: 'seam', event: 'accepted', slipMm: -1.24 })).toBe(
      'Seam mark, slip −1.2 mm',
    );
    const act = { act: 'hold', what: 'stimulus', on: true } as const;
    expect(told({ kind: 'operator', act, who: 'KL', from: 'dashboard' })).toBe(
      'KL: holds the stimulus',
    );
    expect(actWords({ act: 'choose', name: 'target', value: 52 })).toBe('set target to 52');
    expect(told({ kind: 'something new' } as unknown as Decision)).toBe('something new');
  });
});
