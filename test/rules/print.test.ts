import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { printRules } from '../../server/rules/print.js';
import { formatProblems } from '../../server/rules/problems.js';
import { parseRules } from '../../server/rules/text/parseRules.js';
import { bare, readFile, SESSIONS } from './helpers.js';
import { PHRASES } from './phrases.js';

const SEED = 20260301;

/** A file with one phrase of each key. */
const file = fc
  .record(PHRASES)
  .map((phrases) =>
    [
      'title: "any: thing"',
      'belt: 180 cm',
      'values:',
      `  v: ${phrases.value}`,
      'operator:',
      `  o: ${phrases.operator}`,
      'draws:',
      `  d: ${phrases.draw}`,
      'places:',
      `  p: ${phrases.place}`,
      'phases:',
      `  f: ${phrases.phase}`,
      'rules:',
      '  r:',
      `    when: ${phrases.when}`,
      `    if: ${phrases.if}`,
      `    chance: ${phrases.chance}`,
      `    sham: ${phrases.if}`,
      '    do:',
      `      - ${phrases.do}`,
      '      - note',
      `    limit: ${phrases.limit}`,
      `    within: ${phrases.within}`,
      `    asked: ${phrases.asked}`,
      `end: ${phrases.if}`,
      '',
    ].join('\n'),
  );

/** Mistakes of kind in a random phrase that the parser itself tells; the rest must parse. */
const OF_KIND = new Set(['unitMissing', 'unexpectedWord', 'isNotOr', 'wrongForm']);

describe('a parsed file, printed and parsed again', () => {
  it('is the same tree, for any phrases of the grammar', () => {
    let parsed = 0;
    fc.assert(
      fc.property(file, (text) => {
        const first = parseRules('a.yaml', text);
        // Where the text names two things at once it may be refused, never misread.
        if (!first.file) {
          expect(first.problems.filter(({ code }) => !OF_KIND.has(code))).toEqual([]);
          return;
        }
        parsed++;
        const printed = printRules(first.file);
        const again = parseRules('a.yaml', printed);
        expect(formatProblems(again.problems, again.sources)).toBe('');
        expect(bare(again.file)).toEqual(bare(first.file));
        // And printing settles at once.
        expect(printRules(again.file!)).toBe(printed);
      }),
      { seed: SEED, numRuns: 150 },
    );
    expect(parsed).toBeGreaterThan(50);
  });

  it.each(readdirSync(SESSIONS).filter((name) => name.endsWith('.yaml')))(
    'is the same tree: %s',
    (name) => {
      const path = join(SESSIONS, name);
      const { file: rules } = parseRules(path, readFile);
      const printed = printRules(rules!);
      const again = parseRules(path, (wanted) => (wanted === path ? printed : readFile(wanted)));
      expect(bare(again.file)).toEqual(bare(rules));
    },
  );

  it('keeps the parentheses that matter', () => {
    const text =
      'title: t\nbelt: 180 cm\nrules:\n  r:\n    when: lick\n    if: (lap - (2 - 1)) * 3 / (4 / 2) > 1 and not (still or in a1)\n    do: note\n';
    const { file: rules } = parseRules('a.yaml', text);
    expect(printRules(rules!)).toContain(
      'if: (lap - (2 - 1)) * 3 / (4 / 2) > 1 and not (still or in a1)',
    );
  });

  it('goes on over lines where a phrase is long', () => {
    const long = Array.from({ length: 30 }, (_, n) => `lap is ${n}`).join(' or ');
    const text = `title: t\nbelt: 180 cm\nrules:\n  r:\n    when: lick\n    if: ${long}\n    do: note\n`;
    const printed = printRules(parseRules('a.yaml', text).file!);
    expect(Math.max(...printed.split('\n').map((line) => line.length))).toBeLessThanOrEqual(100);
    expect(bare(parseRules('a.yaml', printed).file)).toEqual(bare(parseRules('a.yaml', text).file));
  });
});
