import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { packageRoot } from '../../server/packageRoot.js';
import { PROBLEMS } from '../../server/rules/problemCodes.js';
import { formatProblems } from '../../server/rules/problems.js';
import { checkText } from '../../server/rules/readRules.js';
import { FREE_WORDS, RESERVED } from '../../server/rules/text/words.js';
import { UNITS } from '../../server/rules/units.js';
import { around, check, RIG, readFile, SESSIONS } from './helpers.js';

const page = readFileSync(join(packageRoot, 'server/rules/RULES.md'), 'utf8');
const blocks = (kind: string): string[] =>
  [...page.matchAll(new RegExp(`\`\`\`${kind}\\n([\\s\\S]*?)\`\`\``, 'g'))].map(
    (match) => match[1]!,
  );
const sessions = readdirSync(SESSIONS).filter((name) => /^\d\d-.*\.yaml$/.test(name));
const schema = JSON.parse(
  readFileSync(join(packageRoot, 'server/rules/rules.schema.json'), 'utf8'),
);
const valid = new Ajv2020({ allErrors: true }).compile(schema);
const outline = (text: string): unknown => parse(text, { schema: 'failsafe' });

describe('the page', () => {
  it.each(blocks('yaml'))('has an example that passes: %#', (text) => {
    const { problems, sources } = check(text);
    expect(formatProblems(problems, sources)).toBe('');
    expect(valid(outline(text))).toBe(true);
  });

  const phrases = blocks('phrases').flatMap((block) => block.trim().split('\n'));
  it('has phrases for every key', () => {
    const keys = new Set(phrases.map((phrase) => phrase.split(':')[0]));
    expect([...keys].sort()).toEqual(
      [
        'asked',
        'chance',
        'do',
        'draw',
        'if',
        'limit',
        'operator',
        'phase',
        'place',
        'value',
        'when',
        'within',
      ].sort(),
    );
  });
  it.each(phrases)('has a phrase that passes: %s', (phrase) => {
    const colon = phrase.indexOf(':');
    const { problems, sources } = check(around(phrase.slice(0, colon), phrase.slice(colon + 2)));
    const errors = problems.filter(({ severity }) => severity === 'error');
    expect(formatProblems(errors, sources)).toBe('');
  });

  it('has every word of its grammar reserved or free, and no other', () => {
    const grammar = blocks('ebnf')[0]!;
    const words = [...grammar.matchAll(/"([^"]+)"/g)]
      .flatMap(([, quoted]) => quoted!.split(' '))
      .filter((word) => /^[a-z]+$/.test(word));
    const reserved = new Set([...RESERVED, ...FREE_WORDS].filter((word) => !(word in UNITS)));
    // "a" and "m" are both words; only the words of the grammar are compared.
    expect([...new Set(words)].sort()).toEqual([...reserved].sort());
  });

  it('lists every code with its severity and meaning, and no other', () => {
    const rows = [...page.matchAll(/^\| `(\w+)` +\| (error|warning) +\| (.*?) +\|$/gm)];
    const listed = rows.map(([, code, severity, meaning]) => [code, { severity, meaning }]);
    expect(Object.fromEntries(listed)).toEqual({ ...PROBLEMS });
  });
});

describe('the twelve sessions', () => {
  it('are twelve', () => expect(sessions).toHaveLength(12));
  it.each(sessions)('%s has neither errors nor warnings', (name) => {
    const { problems, sources } = checkText(join(SESSIONS, name), readFile, RIG);
    expect(formatProblems(problems, sources)).toBe('');
  });
  it.each(sessions)('%s fits the schema', (name) => {
    valid(outline(readFileSync(join(SESSIONS, name), 'utf8')));
    expect(valid.errors).toBeNull();
  });
});

describe('the schema', () => {
  const base = { title: 't', belt: '180 cm', rules: { r: { when: 'lap begins', do: 'note' } } };
  it.each([
    ['an unknown key', { ...base, place: {} }],
    ['no rules', { title: 't', belt: '180 cm' }],
    ['a list where a phrase belongs', { ...base, rules: { r: { when: ['lick'], do: 'note' } } }],
    ['a rule without do', { ...base, rules: { r: { when: 'lick' } } }],
    ['a belt without a unit', { ...base, belt: '180' }],
    ['a name that is none', { ...base, values: { '1a': '4 uL' } }],
  ])('refuses %s', (_, file) => expect(valid(file)).toBe(false));
  it('accepts a list of actions', () => {
    expect(valid({ ...base, rules: { r: { when: 'lick', do: ['note', 'end session'] } } })).toBe(
      true,
    );
  });
});
