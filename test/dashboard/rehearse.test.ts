import { readFileSync } from 'node:fs';
import { CompletionContext } from '@codemirror/autocomplete';
import { EditorState } from '@codemirror/state';
import { describe, expect, test } from 'vitest';
import { complete, namesIn } from '../../dashboard/editor/completion.js';
import { LAPS_KEPT, LapStore, MARK } from '../../dashboard/model/laps.js';
import {
  countWords,
  emptyRehearse,
  fileNameOf,
  isChanged,
  itemAt,
  lapsInto,
  placesOf,
  spotsWords,
} from '../../dashboard/model/rehearse.js';
import type { Told } from '../../dashboard/stream/ask.js';
import type { RulesApi } from '../../dashboard/stream/rulesApi.js';
import { Desk } from '../../dashboard/view/rehearse/desk.js';
import { packageRoot } from '../../server/packageRoot.js';
import type {
  CheckAnswer,
  Outlined,
  RehearsalResult,
  RulesOutline,
} from '../../server/web/rules/rulesMessages.js';
import { until } from '../web/webRig.js';

const item = (name: string, from: number, to: number): Outlined => ({
  ...{ name, from, to, line: 1, words: '' },
  spots: [{ fromCm: 170, toCm: 10, kind: 'span' }],
});
const outline: RulesOutline = {
  title: 'x',
  beltCm: 180,
  places: [item('zone', 10, 20)],
  rules: [item('water', 30, 50), item('light', 52, 80)],
  phases: [],
};

describe('what the page makes of an outline', () => {
  test('the cursor is in the rule or place whose text it stands in', () => {
    expect(itemAt(outline, 15)?.name).toBe('zone');
    expect(itemAt(outline, 50)?.name).toBe('water');
    expect(itemAt(outline, 51)).toBeUndefined();
    expect(itemAt(null, 15)).toBeUndefined();
  });

  test('stretches are told in words, over the seam too', () => {
    expect(spotsWords([])).toBe('at no place of its own');
    const spots = [
      { fromCm: 45, toCm: 45, kind: 'point' },
      { fromCm: 170, toCm: 10.04, kind: 'span' },
      { fromCm: 20, toCm: 140, kind: 'somewhere' },
    ] as const;
    expect(spotsWords(spots)).toBe(
      'at 45 cm, or from 170 to 10 cm, over the seam, or somewhere from 20 to 140 cm',
    );
    expect(placesOf(outline)).toEqual([{ name: 'zone', fromCm: 170, toCm: 10 }]);
  });

  test('problems are counted in words', () => {
    const one = (severity: 'error' | 'warning') => ({
      ...{ severity, code: 'x', message: '', also: [], path: 'a', here: true },
      ...{ line: 1, column: 1, from: 0, to: 0 },
    });
    expect(countWords([])).toBe('No problems');
    expect(countWords([one('error'), one('warning'), one('warning')])).toBe('1 error, 2 warnings');
  });

  test('a name without an ending gets one', () => {
    expect(fileNameOf(' day2 ')).toBe('day2.yaml');
    expect(fileNameOf('a/b.YML')).toBe('a/b.YML');
    expect(fileNameOf(' ')).toBe('');
    expect(isChanged({ ...emptyRehearse(), text: 'x' })).toBe(true);
  });
});

test('the laps of a result fill the store up to the lap on top, and no further back than it holds', () => {
  const raster = Array.from({ length: 100 }, (_, lap) => ({
    ...{ lap, mm: [900, 450], kinds: ['water', 'sham'] as const },
  }));
  const result = { raster } as unknown as RehearsalResult;
  const store = new LapStore();
  lapsInto(store, result, 60);
  expect(store.newest).toBe(60);
  expect(store.get(61)).toBeUndefined();
  expect(store.get(60 - LAPS_KEPT)).toBeUndefined();
  const lap = store.get(60 - LAPS_KEPT + 1)!;
  expect([...lap.positionCm.slice(0, lap.count)]).toEqual([90, 45]);
  expect([...lap.kind.slice(0, lap.count)]).toEqual([MARK.water, MARK.sham]);
  lapsInto(store, result, 99);
  expect(store.get(99)!.count).toBe(2);
});

describe('completion', () => {
  const text = readFileSync(
    `${packageRoot}/hardware-sim/demo/sessions/06-induction-sham.yaml`,
    'utf8',
  );
  const rig = { beltCm: 180, outputs: [{ name: 'gate', kind: 'stimulus' }], inputs: ['shutter'] };
  const labels = (typed: string, explicit = true) => {
    const doc = `${text}${typed}`;
    const state = EditorState.create({ doc });
    const found = complete(new CompletionContext(state, doc.length, explicit), rig);
    return found?.options.map(({ label }) => label) ?? [];
  };

  test("offers the file's own names with their section", () => {
    expect(namesIn(text)).toContainEqual({ name: 'induce', section: 'rules' });
    expect(namesIn(text)).not.toContainEqual({ name: 'when', section: 'rules' });
  });

  test('offers sections at the margin, keys in a rule, and names, words or units in a phrase', () => {
    expect(labels('\nti')).toContain('title');
    expect(labels('\nrules:\n  more:\n    ')).toEqual(
      expect.arrayContaining(['when', 'if', 'do', 'limit', 'within', 'sham', 'chance']),
    );
    const phrase = labels('\nrules:\n  more:\n    when: rea');
    expect(phrase).toEqual(
      expect.arrayContaining(['reaches', 'target', 'gate', 'shutter', 'induce']),
    );
    expect(labels('\nrules:\n  more:\n    when: every 2 s')).toEqual(
      expect.arrayContaining(['s', 'ms', 'cm', 'uL']),
    );
  });

  test('offers nothing in a comment, a title, a new name, or before anything was typed', () => {
    expect(labels('\n# wh')).toEqual([]);
    expect(labels('\ntitle: wa')).toEqual([]);
    expect(labels('\nplaces:\n  ne')).toEqual([]);
    expect(labels('\nend: ', false)).toEqual([]);
  });
});

describe('the desk', () => {
  const answer = (right: boolean): CheckAnswer => ({
    ...{ right, problems: [], outline: null, explain: '' },
  });
  const good = <T>(value: T): Promise<Told<T>> => Promise.resolve({ done: true, value });

  /** A service whose checks are answered when, and in the order in which, the test says. */
  function scripted() {
    const asked: { text: string; tell: (right: boolean) => void }[] = [];
    const api: RulesApi = {
      list: () => good({ files: ['a.yaml'], rig: { beltCm: 180, outputs: [], inputs: [] } }),
      open: (path) => good({ path, text: '\ufefftitle: a\r\nbelt: 1 m\r\n', version: 'v1' }),
      save: () => good({ version: 'v2' }),
      check: (text) =>
        new Promise((resolve) => {
          const tell = (right: boolean) => resolve({ done: true, value: answer(right) });
          asked.push({ text, tell });
        }),
      rehearse: () => good({ number: 1 }),
      rehearsal: () => good({ state: 'none' }),
      cancel: () => good({}),
    };
    return { api, asked };
  }

  test('opens a file as the editor counts it, and saves it with its version', async () => {
    const { api } = scripted();
    const saved: unknown[] = [];
    const save: RulesApi['save'] = (file) => {
      saved.push(file);
      return good({ version: 'v2' });
    };
    const desk = new Desk(() => {}, { ...api, save });
    await desk.start();
    expect(desk.state.text).toBe('title: a\nbelt: 1 m\n');
    expect(desk.unsaved).toBe(false);
    desk.changed('title: b\n');
    expect(desk.unsaved).toBe(true);
    await desk.save();
    await desk.save('c');
    expect(saved).toEqual([
      { path: 'a.yaml', text: 'title: b\n', version: 'v1' },
      { path: 'c.yaml', text: 'title: b\n' },
    ]);
    expect(desk.state).toMatchObject({ path: 'c.yaml', files: ['a.yaml', 'c.yaml'] });
    expect(desk.unsaved).toBe(false);
  });

  test('shows only the answer about the text that is there now, whatever order they come in', async () => {
    const { api, asked } = scripted();
    const desk = new Desk(() => {}, api);
    await desk.start();
    await until(() => asked.length === 1);
    desk.changed('first');
    await until(() => asked.length === 2);
    desk.changed('second');
    await until(() => asked.length === 3);
    expect(asked.map(({ text }) => text).slice(1)).toEqual(['first', 'second']);
    asked[2]!.tell(true);
    await until(() => desk.state.check?.right === true);
    asked[1]!.tell(false);
    await new Promise((resolve) => setTimeout(resolve, 5));
    expect(desk.state.check?.right).toBe(true);
    expect(desk.state.checking).toBe(false);
  });
});
