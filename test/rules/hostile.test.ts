import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { compile } from '../../server/rules/engine/compile.js';
import { explain } from '../../server/rules/explain.js';
import { formatProblems } from '../../server/rules/problems.js';
import { checkText } from '../../server/rules/readRules.js';
import {
  LONGEST_FILE,
  LONGEST_LINE,
  LONGEST_NAME,
  MOST_NAMES,
  MOST_PROBLEMS,
  MOST_RULES,
  MOST_TOKENS,
} from '../../server/rules/text/caps.js';
import { parseRules } from '../../server/rules/text/parseRules.js';
import { around, check, found, RIG, SESSIONS, sections } from './helpers.js';
import { PHRASES } from './phrases.js';

const SEED = 20260302;
const RUNS = 150;
const codes = (text: string): string[] => check(text).problems.map(({ code }) => code);

/** Never a throw; a file or an error; every problem inside its text and printable. */
function survives(text: string): void {
  const { file, problems, sources } = check(text);
  const failed = problems.some(({ severity }) => severity === 'error');
  expect(file === undefined).toBe(failed);
  expect(problems.length).toBeLessThanOrEqual(2 * (MOST_PROBLEMS + 1));
  for (const { at, message } of problems) {
    expect(message).not.toBe('');
    expect(at.start).toBeGreaterThanOrEqual(0);
    expect(at.end).toBeLessThanOrEqual(Math.max(1, sources[at.file]!.text.length));
    expect(at.end).toBeGreaterThanOrEqual(at.start);
  }
  expect(typeof formatProblems(problems, sources)).toBe('string');
  if (!file) return;
  // Whatever passes can be told and compiled.
  expect(explain(file, RIG)).not.toMatch(/undefined|NaN/);
  compile(file, RIG);
}

describe('a hostile file', () => {
  it.each([
    [
      'an alias bomb',
      `a: &a [x,x]\n${Array.from({ length: 30 }, (_, n) => `b${n}: &b${n} [*a,*a]`).join('\n')}`,
      'yamlNotAllowed',
    ],
    ['flow lists nested without end', '['.repeat(1_000), 'yamlNotAllowed'],
    ['flow maps nested over many lines', '{a:\n'.repeat(50_000), 'yamlNotAllowed'],
    ['lists within lists', `a:\n${'- '.repeat(900)}x`, 'tooDeep'],
    ['explicit keys', '? '.repeat(900), 'yamlNotAllowed'],
    ['colons without end', ': '.repeat(900), 'yamlSyntax'],
    [
      'indents without end',
      Array.from({ length: 300 }, (_, n) => `${' '.repeat(n)}a:`).join('\n'),
      'tooDeep',
    ],
    ['a megabyte on a line', 'x'.repeat(1024 * 1024), 'tooLarge'],
    ['a line just too long', `title: ${'x'.repeat(LONGEST_LINE)}`, 'tooLarge'],
    ['a file just too long', '# x\n'.repeat(LONGEST_FILE / 4) + '#', 'tooLarge'],
    ['a zero', 'title: a\u0000', 'encoding'],
    ['half a surrogate pair', 'title: \ud800', 'encoding'],
    ['text that turns round', 'title: \u202eabc', 'encoding'],
    ['an escape for the terminal', 'title: \u001b[2J', 'encoding'],
    ['old line ends', 'title: t\rbelt: 180 cm', 'encoding'],
    ['a merge key', sections({ values: '<<: 4 uL' }), 'yamlNotAllowed'],
    ['a merge key at the top', '<<: x\n', 'yamlNotAllowed'],
    ['a tag', sections({ values: 'x: !!js/function 4' }), 'yamlNotAllowed'],
    ['a second document', `${sections({})}---\na: b\n`, 'yamlNotAllowed'],
    ['an end of document', `${sections({})}...\n`, 'yamlNotAllowed'],
    ['a block scalar', sections({ values: 'x: |\n  4 uL' }), 'yamlNotAllowed'],
    ['an escape in quotes', sections({ values: 'x: "4\\u0020uL"' }), 'yamlNotAllowed'],
    ['a tab', 'title: t\nrules:\n\tr: x\n', 'yamlSyntax'],
    ['a prototype key', '__proto__: x\n', 'unknownKey'],
    ['a prototype name', sections({ values: '__proto__: 4 uL' }), 'badName'],
    [
      'a name that is too long',
      sections({ values: `${'v'.repeat(LONGEST_NAME + 1)}: 4 uL` }),
      'badName',
    ],
    ['a huge number', sections({ values: `v: ${'9'.repeat(400)} h` }), 'tooLarge'],
    ['a fine number', sections({ values: `v: 0.${'1'.repeat(400)} h` }), 'tooLarge'],
    [
      'a phrase of too many words',
      sections({ end: `lap > 1${' + 1'.repeat(MOST_TOKENS)}` }),
      'tooLarge',
    ],
    ['parentheses without end', sections({ end: `${'('.repeat(300)}lap > 1` }), 'tooDeep'],
    [
      'too many names',
      sections({
        values: Array.from({ length: MOST_NAMES + 1 }, (_, n) => `v${n}: 4 uL`).join('\n'),
      }),
      'tooMany',
    ],
    [
      'too many rules',
      sections({
        rules: Array.from(
          { length: MOST_RULES + 1 },
          (_, n) => `r${n}:\n  when: lap begins\n  do: note`,
        ).join('\n'),
      }),
      'tooMany',
    ],
    ['nothing', '', 'missingKey'],
    ['a list', '- a\n- b\n', 'missingKey'],
  ])('is refused for %s', (_, text, code) => {
    expect(codes(text)).toContain(code);
    survives(text);
  });

  it.each([
    ['UTF-16, little end first', Buffer.from('\ufefftitle: t\n', 'utf16le')],
    ['UTF-16, big end first', Buffer.from('\ufefftitle: t\n', 'utf16le').swap16()],
    ['UTF-16 without a mark', Buffer.from('title: t\n', 'utf16le')],
    ['Latin-1', Buffer.from('title: M\u00fcll\n', 'latin1')],
  ])('is refused in %s', (_, bytes) => {
    const { problems } = parseRules('a.yaml', () => bytes);
    expect(problems.map(({ code }) => code)).toEqual(['encoding']);
  });

  it('may begin with a byte-order mark and end its lines in CR LF', () => {
    const text = `\ufeff${sections({}).replaceAll('\n', '\r\n')}`;
    expect(found(text)).toEqual([]);
    expect(parseRules('a.yaml', () => Buffer.from(text)).problems).toEqual([]);
  });

  it('may call a value `constructor`', () => {
    const text = sections({
      values: 'constructor: 45 cm',
      rules: 'r:\n  when: reaches constructor\n  do: note',
    });
    expect(found(text)).toEqual([]);
    expect(found(text.replace('reaches constructor', 'reaches toString'))).toContain(
      'unknownName: toString',
    );
  });

  it('with a thousand mistakes shows a hundred', () => {
    const values = Array.from({ length: 900 }, (_, n) => `v${n}: nothing${n} + 4`).join('\n');
    const { problems } = check(sections({ values }));
    expect(problems).toHaveLength(MOST_PROBLEMS + 1);
    expect(problems.map(({ code }) => code)).toContain('tooMany');
  });

  it('with names that need each other in a long chain is still told', () => {
    const values = Array.from({ length: 500 }, (_, n) => `v${n}: v${(n + 1) % 500} + 1 cm`).join(
      '\n',
    );
    expect(codes(sections({ values, rules: 'r:\n  when: reaches v0\n  do: note' }))).toContain(
      'circle',
    );
  });

  it.each([
    ['doubled by +', 'v0: 1 cm', (n: number) => `v${n + 1}: v${n} + v${n}`],
    ['doubled by *', 'v0: 1', (n: number) => `v${n + 1}: v${n} * v${n}`],
  ])('with names %s from line to line is refused before they are reckoned', (_, first, next) => {
    const values = [first, ...Array.from({ length: 200 }, (__, n) => next(n))].join('\n');
    expect(codes(sections({ values, rules: 'r:\n  when: reaches v200\n  do: note' }))).toContain(
      'tooLarge',
    );
  });

  it('with places doubled through their edges is refused before they are reckoned', () => {
    const place = (n: number): string =>
      `p${n + 1}: start of p${n} to start of p${n} + end of p${n} - 5 cm`;
    const places = ['p0: 40 to 50 cm', ...Array.from({ length: 100 }, (_, n) => place(n))].join(
      '\n',
    );
    expect(codes(sections({ places, rules: 'r:\n  when: enters p100\n  do: note' }))).toContain(
      'tooLarge',
    );
  });

  it.each(['v: v + v', 'v: v * v', 'v: start of v + end of v'])(
    'with %s is told of the circle',
    (values) => {
      expect(codes(sections({ values, rules: 'r:\n  when: reaches v\n  do: note' }))).toContain(
        'circle',
      );
    },
  );

  it('with names one within another, a chain and no tree, is fine', () => {
    const values = [
      'v0: 1 cm',
      ...Array.from({ length: 30 }, (_, n) => `v${n + 1}: v${n} + 1 cm`),
    ].join('\n');
    expect(found(sections({ values, rules: 'r:\n  when: reaches v30\n  do: note' }))).toEqual([]);
  });
});

describe('a file brought in', () => {
  const main = (include: string): string =>
    `title: t\nbelt: 180 cm\ninclude: ${include}\nrules:\n  r:\n    when: reaches spot\n    do: note\nend: time >= 1 h\n`;
  const reading = (files: Record<string, string>) => (path: string) => files[path];

  it('gives its values and places, from below the folder', () => {
    const files = {
      'lab/main.yaml': main('shared/places.yaml'),
      'lab/shared/places.yaml': 'places:\n  spot: 45 cm\n  other: 60 cm\n',
    };
    const { file, problems } = checkText('lab/main.yaml', reading(files), RIG);
    expect(problems).toEqual([]);
    expect(file!.places.map(({ name }) => name.name)).toEqual(['spot', 'other']);
    expect(file!.places[0]!.at.file).toBe(1);
  });
  it('is told of in its own text', () => {
    const files = { 'main.yaml': main('a.yaml'), 'a.yaml': 'places:\n  spot: 45 cmm\n' };
    const { problems, sources } = checkText('main.yaml', reading(files), RIG);
    expect(formatProblems(problems, sources)).toContain('a.yaml:2:12: error:');
  });
  it('may hold nothing but values and places', () => {
    const files = {
      'main.yaml': main('a.yaml'),
      'a.yaml': 'include: b.yaml\nplaces:\n  spot: 45 cm\n',
    };
    expect(checkText('main.yaml', reading(files), RIG).problems.map(({ code }) => code)).toEqual([
      'unknownKey',
    ]);
  });
  it('may not use a name that is taken, and both places are named', () => {
    const files = {
      'main.yaml': main('a.yaml'),
      'a.yaml': 'places:\n  spot: 45 cm\nvalues:\n  r: 4 uL\n',
    };
    const [problem] = checkText('main.yaml', reading(files), RIG).problems;
    expect(problem!.code).toBe('nameTwice');
    expect(problem!.also![0]!.at.file).toBe(1);
  });
  it.each([
    '../a.yaml',
    'x/../../a.yaml',
    '/etc/a.yaml',
    'C:/a.yaml',
    'c:a.yaml',
    '~/a.yaml',
    'x\\a.yaml',
    './a.yaml',
    '.hidden.yaml',
    'x//a.yaml',
    'http://x/a.yaml',
    'a.yaml/',
    'a.txt',
    'nul.yaml',
    'x/con.yaml',
    'a.yaml.',
    '%2e%2e/a.yaml',
    `${'d/'.repeat(150)}a.yaml`,
  ])('is never read from %s', (path) => {
    const asked: string[] = [];
    const { problems } = parseRules('lab/main.yaml', (name) => {
      asked.push(name);
      return name === 'lab/main.yaml'
        ? main(JSON.stringify(path).replaceAll('\\\\', '\\').replaceAll('"', "'"))
        : 'places:\n  spot: 45 cm\n';
    });
    expect(problems.map(({ code }) => code)).toContain('badPath');
    expect(asked).toEqual(['lab/main.yaml']);
  });
});

describe('a table', () => {
  const main =
    'title: t\nbelt: 180 cm\ntables:\n  rows: a.csv\nrules:\n  r:\n    when: every row of rows\n    do: give 4 uL\nend: time >= 1 h\n';
  const read = (csv: string) =>
    checkText('main.yaml', (path) => (path === 'a.csv' ? csv : main), RIG);
  it('of places gives laps and places', () => {
    expect(read('lap,place_cm\n1,88.2\n1,90\n4,86.9\n').file!.tables[0]!.rows).toEqual({
      kind: 'places',
      lap: [1, 1, 4],
      placeCm: [88.2, 90, 86.9],
    });
  });
  it('of times gives microseconds', () => {
    expect(read('time_s\r\n1.5\r\n2.000001\r\n').file!.tables[0]!.rows).toEqual({
      kind: 'times',
      timeUs: [1_500_000, 2_000_001],
    });
  });
  it.each([
    ['other columns', 'place,lap\n1,2\n', 'badTable', 1],
    ['no rows', 'time_s\n', 'badTable', 1],
    ['nothing', '', 'badTable', 1],
    ['a cell too many', 'time_s\n1,2\n', 'badTable', 2],
    ['a word', 'time_s\nsoon\n', 'badTable', 2],
    ['half a lap', 'lap,place_cm\n1.5,20\n', 'badTable', 2],
    ['a time before the last', 'time_s\n5\n\n4\n', 'tableOrder', 4],
    ['a lap before the last', 'lap,place_cm\n3,20\n2,30\n', 'tableOrder', 3],
    ['a place before the last of its lap', 'lap,place_cm\n3,20\n3,20\n', 'tableOrder', 3],
  ])('with %s is refused, with its line', (_, csv, code, line) => {
    const { problems, sources } = read(csv);
    expect(problems.map((problem) => problem.code)).toEqual([code]);
    expect(formatProblems(problems, sources)).toContain(`a.csv:${line}:1: error:`);
  });
  it('in order is not told of its order', () =>
    expect(read('time_s\n4\n5\n').problems).toEqual([]));
  it('with a place off the belt is refused', () => {
    expect(read('lap,place_cm\n1,200\n').problems.map(({ code }) => code)).toEqual(['offBelt']);
  });
});

describe('any text at all', () => {
  const words = fc.constantFrom(
    'title:',
    'belt:',
    'rules:',
    'draws:',
    'places:',
    'when:',
    'do:',
    'if:',
    '  ',
    '    ',
    '\n',
    ' ',
    '- ',
    'reaches',
    '45 cm',
    'to',
    'and',
    'or',
    '(',
    ')',
    'lap',
    'phase is',
    'zone',
    'give 4 uL',
    ',',
    '"',
    "'",
    '#',
    '&',
    '*',
    '!',
    '|',
    '>',
    '{',
    '[',
    '%',
    'µL',
    '\t',
    '\u00a0',
    '..',
    'every',
    '9'.repeat(20),
    '\u{1f42d}',
  );
  it('is read without a throw', () => {
    fc.assert(fc.property(fc.string({ unit: 'binary', maxLength: 300 }), survives), {
      seed: SEED,
      numRuns: 150,
    });
  });
  it('of words of the language is read without a throw', () => {
    fc.assert(
      fc.property(
        fc.array(words, { maxLength: 80 }).map((all) => all.join('')),
        survives,
      ),
      { seed: SEED, numRuns: 150 },
    );
  });
  it('made of a session by a few changes is read without a throw', () => {
    const files = readdirSync(SESSIONS).filter(
      (name) => /^\d/.test(name) && name.endsWith('.yaml'),
    );
    const texts = files.map((name) => readFileSync(join(SESSIONS, name), 'utf8'));
    const change = fc.record({
      at: fc.nat(700),
      cut: fc.nat(12),
      put: fc.oneof(fc.constant(''), words),
    });
    fc.assert(
      fc.property(
        fc.constantFrom(...texts),
        fc.array(change, { minLength: 1, maxLength: 4 }),
        (text, changes) => {
          survives(
            changes.reduce(
              (now, { at, cut, put }) => now.slice(0, at) + put + now.slice(at + cut),
              text,
            ),
          );
        },
      ),
      { seed: SEED, numRuns: 150 },
    );
  });
  it('that is one phrase of the grammar, whatever it means, is told or passes whole', () => {
    const keys = Object.keys(PHRASES) as (keyof typeof PHRASES)[];
    const phrase = fc
      .constantFrom(...keys)
      .chain((key) => PHRASES[key].map((text) => around(key, text)));
    fc.assert(fc.property(phrase, survives), { seed: SEED, numRuns: RUNS });
  });
});
