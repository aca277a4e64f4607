import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { changeWords } from '../../dashboard/model/change.js';
import {
  actOf,
  DEFAULT_KEYMAP,
  KEYED,
  KEYS_AN_ACT,
  keyLabel,
  keyProblem,
  readKeymap,
  slotAct,
  withKey,
} from '../../dashboard/model/keymap.js';
import { emptyLive, type Live, take } from '../../dashboard/model/live.js';
import { askedWords, endWords, nextWords, progressWords } from '../../dashboard/model/phase.js';
import { AGAIN_MS, readSounds, SILENT, SoundWatch } from '../../dashboard/model/sounds.js';
import { actWords, eventWords } from '../../dashboard/model/words.js';
import type { AlarmView } from '../../server/loop/alarms/alarms.js';
import type { Decision } from '../../server/session/decisions.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';

describe('the keys', () => {
  test('no key has two acts, and every act but the second stop has one', () => {
    const codes = KEYED.flatMap(({ act }) => DEFAULT_KEYMAP[act]!);
    expect(new Set(codes).size).toBe(codes.length);
    for (const { act } of KEYED) {
      if (act !== 'stop') expect(DEFAULT_KEYMAP[act]!.length, act).toBeGreaterThan(0);
    }
    for (const { act } of KEYED) {
      for (const code of DEFAULT_KEYMAP[act]!)
        expect(keyProblem(DEFAULT_KEYMAP, act, code)).toBe('');
    }
  });

  test('one that is taken is refused with what has it; so are those that the page needs', () => {
    expect(keyProblem(DEFAULT_KEYMAP, 'mark', 'KeyS')).toBe(
      'S is taken: Hold or release the stimulus. Change that first.',
    );
    for (const code of ['Escape', 'Tab', 'Enter', 'Space', 'ArrowUp', 'ShiftLeft', 'F5', '']) {
      expect(keyProblem(DEFAULT_KEYMAP, 'mark', code), code).not.toBe('');
    }
    // A pedal is a keyboard of its own.
    for (const code of ['F13', 'PageDown', 'KeyB', 'IntlBackslash']) {
      expect(keyProblem(DEFAULT_KEYMAP, 'mark', code), code).toBe('');
    }
  });

  test('a key is changed, added and taken away, and found again by its place', () => {
    const map = withKey(withKey(DEFAULT_KEYMAP, 'mark', 0, 'F13'), 'stop', 0, 'PageDown');
    expect(actOf(map, 'F13')).toBe('mark');
    expect(actOf(map, 'KeyN')).toBeUndefined();
    expect(actOf(map, 'NumpadAdd')).toBe('mark');
    expect(actOf(map, 'PageDown')).toBe('stop');
    expect(actOf(withKey(map, 'stop', 0, undefined), 'PageDown')).toBeUndefined();
    expect(slotAct(8)).toBe('slot 9');
    expect(slotAct(9)).toBeUndefined();
  });

  test('whatever the browser kept comes back as a map without conflicts', () => {
    const code = fc.constantFrom(
      'KeyS',
      'KeyW',
      'KeyQ',
      'F13',
      'Escape',
      'Numpad1',
      '',
      'Nonsense',
    );
    const kept = fc.dictionary(
      fc.constantFrom(...KEYED.map(({ act }) => act as string), 'fly'),
      fc.oneof(fc.array(fc.oneof(code, fc.integer())), fc.string(), fc.constant(null)),
    );
    fc.assert(
      fc.property(kept, (said) => {
        const map = readKeymap(JSON.stringify(said));
        const codes = KEYED.flatMap(({ act }) => map[act]!);
        expect(new Set(codes).size).toBe(codes.length);
        for (const { act } of KEYED) expect(map[act]!.length).toBeLessThanOrEqual(KEYS_AN_ACT);
        expect(codes).not.toContain('Escape');
        expect(readKeymap(JSON.stringify(map))).toEqual(map);
      }),
      { seed: 11, numRuns: 200 },
    );
    for (const text of [null, '', '{', '[]', '7', 'null']) {
      expect(readKeymap(text)).toEqual(DEFAULT_KEYMAP);
    }
  });

  test('are called what stands on them', () => {
    const codes = ['KeyS', 'Digit7', 'Numpad0', 'NumpadAdd', 'BracketLeft', 'PageDown', 'F13'];
    expect(codes.map(keyLabel)).toEqual(['S', '7', 'Pad 0', 'Pad +', '[', 'Page Down', 'F13']);
  });
});

describe('the big figures', () => {
  const at = (seconds: number) => {
    const animal = new ScriptedAnimal();
    animal.begin('induction.yaml', 'M12');
    animal.advance(seconds);
    return animal;
  };

  test('say how far the phase has come, in its own unit', () => {
    const { state } = at(40);
    expect(progressWords({ ...state, phase: 'baseline' })).toMatch(/^\d of 7$/);
    const progress = (done: number, of: number, unit: string) =>
      progressWords({ ...state, progress: { done, of, unit, what: '' } });
    expect(progress(125e6, 900e6, 'us')).toBe('2:05 of 15:00');
    expect(progress(120_000, 400_000, 'nL')).toBe('120 of 400 µL');
    expect(progress(3, 10, '')).toBe('3 of 10');
    expect(progress(null as unknown as number, 10, '')).toBeUndefined();
    expect(progressWords({ ...state, progress: null })).toBeUndefined();
    expect(progressWords(undefined)).toBeUndefined();
  });

  test('say what the next stimulus waits for', () => {
    const { state, setup } = at(40);
    const rule = (more: object) =>
      state.rules.map((one) => (one.name === 'induce' ? { ...one, armed: false, ...more } : one));
    const next = (more: object) => nextWords({ ...state, ...more }, setup);
    expect(next({ rules: rule({ armed: true }) })).toBe('armed');
    expect(next({ rules: rule({}) })).toBe('not armed');
    expect(next({ rules: rule({ asked: { fromLap: 9, toLap: 9 } }) })).toBe('asked for lap 9');
    expect(next({ held: { stimulus: 'by KL', water: null }, rules: rule({ armed: true }) })).toBe(
      'held',
    );
    expect(next({ session: 'ended' })).toBeUndefined();
    expect(
      nextWords(state, { ...setup, session: { ...setup.session!, stimuli: [] } }),
    ).toBeUndefined();
  });

  test('say until which lap something is asked for', () => {
    expect(askedWords({ fromLap: 0, toLap: 0 }, 4)).toBe('asked for now');
    expect(askedWords({ fromLap: 5, toLap: 7 }, 4)).toBe('asked for laps 5 to 7');
    expect(askedWords({ fromLap: 5, toLap: 7 }, 6)).toBe('asked for until lap 7');
  });

  test.each([
    [{ laps: 12, s: null, exact: true }, 'in 12 laps'],
    [{ laps: 12, s: 130, exact: false }, 'in about 12 laps, 2 min'],
    [{ laps: 1, s: 8, exact: false }, 'with this lap, 8 s'],
    [{ laps: null, s: 240, exact: false }, 'in 4 min'],
    [null, undefined],
  ])('say when it ends: %j', (end, words) => {
    expect(endWords(end)).toBe(words);
  });
});

describe('a change of the operator', () => {
  const chosen = { name: 'target', value: 45, queued: null, fromLap: null, waits: false };
  test('is told from queue to board', () => {
    expect(changeWords({ ...chosen, queued: 52, fromLap: 31 }, 'cm', undefined)).toBe(
      '45 to 52 cm from lap 31',
    );
    expect(changeWords({ ...chosen, value: 52, waits: true }, 'cm', undefined)).toBe(
      '52 cm counts; the board has yet to be armed by it',
    );
    expect(changeWords({ ...chosen, value: 52 }, 'cm', 31)).toBe(
      'The board confirmed 52 cm in lap 31',
    );
    expect(changeWords(chosen, 'cm', undefined)).toBe('');
    expect(changeWords({ ...chosen, value: 4000, queued: 3500 }, 'nL', undefined)).toBe(
      '4 to 3.5 µL now',
    );
    expect(changeWords({ ...chosen, value: 'short', queued: 'long' }, '', undefined)).toBe(
      'short to long now',
    );
  });

  test('is followed by its events, for this session only', () => {
    const live: Live = emptyLive();
    let number = 0;
    const tell = (decision: Decision, lap: number) => {
      const stamp = { input: 0, boardUs: 1, lap, positionCm: 9, speedCmPerS: 9 };
      take(
        live,
        { tell: 'events', events: [{ number: ++number, event: { ...stamp, ...decision } }] },
        0,
      );
    };
    const choice = { kind: 'choice', name: 'target', value: 52 } as const;
    tell({ ...choice, state: 'in force' }, 31);
    expect(live.armedAnew.size).toBe(0);
    tell({ ...choice, state: 'armed anew' }, 31);
    expect(live.armedAnew.get('target')).toBe(31);
    tell({ ...choice, state: 'in force' }, 40);
    expect(live.armedAnew.size).toBe(0);
    tell({ ...choice, state: 'armed anew' }, 40);
    tell({ kind: 'session began', title: 't', seed: 's' }, 0);
    expect(live.armedAnew.size).toBe(0);
  });
});

describe('sounds', () => {
  const alarm = (name: string, level: AlarmView['level'], seen = false): AlarmView => ({
    ...{ alarm: name as AlarmView['alarm'], level, text: 't', remedy: 'r', sinceUs: 5 },
    seenBy: seen ? { who: 'KL', from: 'x' } : null,
  });
  const wish = { ...SILENT, on: true };

  test('each alarm once, the gravest of those that come together', () => {
    const watch = new SoundWatch();
    expect(watch.next([], wish, 0)).toBeUndefined();
    expect(
      watch.next([alarm('seam', 'warn'), alarm('link', 'bad'), alarm('end', 'note')], wish, 1),
    ).toBe('bad');
    const on = [alarm('seam', 'warn'), alarm('link', 'bad', true)];
    for (let n = 2; n < 9; n++) expect(watch.next(on, wish, n * 10_000)).toBeUndefined();
    // Over, and raised anew.
    expect(watch.next([], wish, 100_000)).toBeUndefined();
    expect(watch.next([{ ...alarm('seam', 'warn'), sinceUs: 9 }], wish, 100_001)).toBe('warn');
  });

  test('a grave one again and again until somebody has seen it', () => {
    const watch = new SoundWatch();
    watch.next([], wish, 0);
    const sounded: number[] = [];
    for (let ms = 0; ms <= 3 * AGAIN_MS; ms += 1000) {
      const seen = ms > 2 * AGAIN_MS;
      if (watch.next([alarm('link', 'bad', seen)], wish, ms) === 'bad') sounded.push(ms);
    }
    expect(sounded).toEqual([0, AGAIN_MS, 2 * AGAIN_MS]);
  });

  test('not when they are not wished, not of a level that is not, and nothing old when a page is opened', () => {
    const quiet = new SoundWatch();
    quiet.next([], SILENT, 0);
    expect(quiet.next([alarm('link', 'bad')], SILENT, 1)).toBeUndefined();
    const some = new SoundWatch();
    some.next([], wish, 0);
    const no = { ...wish, levels: { ...wish.levels, warn: false } };
    expect(some.next([alarm('seam', 'warn')], no, 1)).toBeUndefined();
    const opened = new SoundWatch();
    expect(opened.next([alarm('seam', 'warn')], wish, 0)).toBeUndefined();
  });

  test('what the browser kept is read as far as it makes sense', () => {
    expect(readSounds(null)).toEqual(SILENT);
    expect(readSounds('{')).toEqual(SILENT);
    expect(readSounds('{"on":true,"volume":9,"levels":{"warn":false}}')).toEqual({
      ...{ on: true, volume: SILENT.volume },
      levels: { bad: true, warn: false, note: true },
    });
  });
});

test('every new act and event has words of its own', () => {
  const acts: OperatorAct[] = [
    { act: 'mark' },
    { act: 'ask', rule: 'induce', laps: 0 },
    { act: 'ask', rule: 'induce', laps: 3 },
    { act: 'withdraw', rule: 'induce' },
    { act: 'put off', laps: 5, minutes: 0 },
    { act: 'acknowledge', alarm: 'all' },
  ];
  expect(acts.map(actWords)).toEqual([
    'made a mark',
    'asked for induce now',
    'asked for induce in the next 3 laps',
    'took back induce',
    'put off the end by 5 laps',
    'saw the alarms',
  ]);
  const stamp = { input: 0, boardUs: 0, lap: 1, positionCm: 2, speedCmPerS: 3 };
  const told = (decision: Decision) => eventWords({ ...stamp, ...decision }).text;
  expect(told({ kind: 'note', text: '', mark: 3, markedUs: 1 })).toBe('Mark 3');
  expect(told({ kind: 'note', text: 'swims', mark: 3, markedUs: 1 })).toBe('Mark 3: swims');
  expect(told({ kind: 'note', text: 'plain' })).toBe('Note: plain');
  const end = { kind: 'end foreseen', laps: 5, s: null, exact: true, reason: 'lap' } as const;
  expect(told(end)).toBe('The end is near: in 5 laps (lap)');
});
