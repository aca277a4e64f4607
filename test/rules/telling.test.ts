import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { isArmable, whyNotArmed } from '../../server/rules/armable.js';
import { bounds } from '../../server/rules/bounds/sessionBounds.js';
import { baseFactor, powersOf } from '../../server/rules/checks/dimensions.js';
import { intervalOf } from '../../server/rules/checks/interval.js';
import { resolve } from '../../server/rules/checks/symbols.js';
import { explain } from '../../server/rules/explain.js';
import { editsBetween, nearestName } from '../../server/rules/nearestName.js';
import { formatProblems } from '../../server/rules/problems.js';
import { checkText } from '../../server/rules/readRules.js';
import { around, check, RIG, readFile, right, SESSIONS, sections } from './helpers.js';

const rule = (when: string, action: string, more = ''): string =>
  sections({ rules: `r:\n  when: ${when}\n  do: ${action}${more}` });
const session = (name: string) => checkText(join(SESSIONS, name), readFile, RIG).file!;

describe('problems printed for people', () => {
  it('show file, line, column, the words underlined, what was expected and the nearest', () => {
    const { problems, sources } = check(around('when', 'reaches targt'));
    expect(formatProblems(problems.slice(0, 1), sources)).toBe(
      [
        'test.yaml:12:19: error: nothing is called `targt` [unknownName]',
        '  12 |     when: reaches targt',
        '     |                   ^^^^^',
        '  expected: a point; known: zone, target, kind',
        '  nearest: target',
      ]
        .join('\n')
        .replace('zone, target, kind', problems[0]!.expected!.split('known: ')[1]!),
    );
  });
  it('show the other place involved', () => {
    const { problems, sources } = check(
      sections({ places: 'r: 45 cm', rules: 'r:\n  when: lick\n  do: note' }),
    );
    const text = formatProblems(problems, sources);
    expect(text).toContain(
      'test.yaml:4:3: first named here, under `places`\n  4 |   r: 45 cm\n    |   ^',
    );
  });
  it('underline words of a phrase that goes on over lines, and of a quoted one, where they stand', () => {
    const long = check(
      rule('lick', 'note', '\n  if: lap > 3\n    and spede > 5 cm/s\n  limit: 1 per lap'),
    );
    expect(formatProblems(long.problems, long.sources)).toContain('test.yaml:8:11:');
    const quoted = check(rule('"reaches  nowhere"', 'note'));
    expect(formatProblems(quoted.problems, quoted.sources)).toContain('test.yaml:5:21:');
  });
  it('trim long lines around the words', () => {
    const long = Array.from({ length: 40 }, (_, n) => `lap is ${n}`).join(' or ');
    const { problems, sources } = check(around('if', `${long} or nowhere > 3 or ${long}`));
    const lines = formatProblems(problems, sources).split('\n');
    expect(lines[1]).toMatch(/^ {2}\d+ \| \.\.\..*nowhere.*\.\.\.$/);
    expect(lines[1]!.length).toBeLessThan(120);
    expect(lines[1]!.slice(lines[2]!.indexOf('^')).startsWith('nowhere')).toBe(true);
  });
  it('are coloured only when asked', () => {
    const { problems, sources } = check(around('when', 'reaches targt'));
    expect(formatProblems(problems, sources)).not.toContain('\u001b');
    expect(formatProblems(problems, sources, { color: true })).toContain(
      '\u001b[31m^^^^^\u001b[0m',
    );
  });
});

describe('the nearest name', () => {
  it('counts letters put in, taken out, replaced and swapped', () => {
    // The usual examples of these distances (from memory).
    expect(editsBetween('kitten', 'sitting')).toBe(3);
    expect(editsBetween('lick', 'lcik')).toBe(1);
    expect(editsBetween('', 'abc')).toBe(3);
  });
  it('is no name that is far', () => {
    expect(nearestName('laser', ['valve', 'tone'])).toBeUndefined();
    expect(nearestName('Laser', ['laser'])).toBe('laser');
  });
});

describe('arithmetic with units', () => {
  const value = (sum: string): number => {
    const file = right(sections({ values: `v: ${sum}` }));
    return intervalOf(file.values[0]!.value.base, resolve(file)).low;
  };
  it.each([
    ['30 cm / 2 s', 15],
    ['15 cm/s * 2 s', 30],
    ['30 cm / 15 cm/s', 2_000_000],
    ['1 / 50 ms', 20],
    ['20 Hz * 2 s', 40],
    ['10 cm/s / 5 cm/s', 2],
    ['2 * 3 + 4', 10],
    ['-5 cm + 1 m', 95],
    ['50 % * 4 uL', 2_000],
  ])('%s comes to %d in base units', (sum, expected) =>
    expect(value(sum)).toBeCloseTo(expected, 9),
  );
  it('has a factor of one where no time is below the line', () => {
    expect(baseFactor(powersOf('length'), powersOf('number'), 1)).toBe(1);
  });
});

describe('the symbol table', () => {
  it('knows what each name is', () => {
    const symbols = resolve(session('06-induction-sham.yaml'), RIG);
    expect(symbols.get('target')).toMatchObject({ kind: 'place', shape: 'point' });
    expect(symbols.get('induction')).toMatchObject({ kind: 'phase', index: 1 });
    expect(symbols.get('induce')).toMatchObject({ kind: 'rule', index: 1 });
    const kind = symbols.get('kind');
    expect(kind?.kind === 'draw' && symbols.yields(kind.decl.choices)).toEqual({
      kind: 'word',
      words: ['stim', 'sham'],
    });
    expect(symbols.get('constructor')).toBeUndefined();
  });
});

describe('a rule that the board may start', () => {
  const why = (when: string, action: string) =>
    whyNotArmed(right(rule(when, action, '\n  limit: 1 per lap')).rules[0]!, RIG);
  it.each([
    ['reaches 90 cm', 'give 4 uL'],
    ['enters 85 to 95 cm', 'pulse laser for 5 ms at 20 Hz, 3 times'],
    ['leaves 85 to 95 cm', 'pulse laser for 5 ms'],
    ['reaches 90 cm', 'pulse laser for 5 ms at 20 Hz, up to 3 s'],
    ['reaches 90 cm', '\n    - give 4 uL\n    - pulse marker for 10 ms'],
  ])('%s: %s', (when, action) => expect(why(when, action)).toBeUndefined());
  it.each([
    ['lick', 'give 4 uL', 'its moment is no place'],
    ['2 s after reaches 90 cm', 'give 4 uL', 'it waits a time after its moment'],
    ['reaches 90 cm', 'after 50 ms, give 4 uL', 'its action is delayed'],
    [
      'reaches 90 cm',
      'pulse laser for 5 ms at 20 Hz while still, up to 1 s',
      'its `while` must be watched',
    ],
    ['reaches 90 cm', 'hold laser, up to 100 ms', '`hold` is done by the host'],
    ['reaches 90 cm', 'pulse marker for 5 ms', 'it drives no output but marks'],
    [
      'reaches 90 cm',
      '\n    - give 4 uL\n    - pulse laser for 10 ms',
      'it has more than one action besides marks',
    ],
  ])('is not %s: %s', (when, action, reason) => expect(why(when, action)).toBe(reason));
  it('without a rig counts every pulse', () => {
    const [two] = right(
      rule('reaches 90 cm', '\n    - give 4 uL\n    - pulse marker for 10 ms'),
    ).rules;
    expect(isArmable(two!)).toBe(false);
  });
});

describe('the most that a session can deliver', () => {
  const of = (text: string) => bounds(right(text), RIG);
  // Worked out by hand from the file and the demo's rig.
  it('is that of its limits', () => {
    const most = of(rule('lick', 'pulse laser for 300 ms', '\n  limit: 10 per session'));
    expect(most.rules[0]).toMatchObject({
      firings: 10,
      because: 'its limits',
      outputs: [{ output: 'laser', pulses: 10, onUs: 3_000_000 }],
    });
  });
  it('counts windows of time: 20 in any 5 min of 45 min', () => {
    const text = rule('lick', 'give 2 uL', '\n  limit: 20 per 5 min').replace('60 min', '45 min');
    expect(of(text).rules[0]!.firings).toBe(200);
  });
  it('counts gaps: 10 s apart in 60 min is 361', () => {
    expect(
      of(rule('lick', 'pulse laser for 1 ms', '\n  limit: at least 10 s apart')).rules[0]!.firings,
    ).toBe(361);
  });
  it('counts laps where the phases have them', () => {
    const most = bounds(session('02-place-moved.yaml'), RIG);
    expect(most.laps).toBe(101);
    expect(most.rules[0]).toMatchObject({ firings: 101, waterNl: 404_000 });
    expect(bounds(session('02-place-moved.yaml'), RIG, 2).laps).toBe(201);
  });
  it('counts the rows of a table', () => {
    expect(bounds(session('11-yoked-control.yaml'), RIG).rules[0]).toMatchObject({
      firings: 4,
      waterNl: 16_000,
    });
  });
  it('counts the pulses of a train and its time on', () => {
    const most = of(
      rule('lick', 'pulse laser for 5 ms at 20 Hz, up to 3 s', '\n  limit: 60 per session'),
    );
    expect(most.rules[0]!.outputs).toEqual([{ output: 'laser', pulses: 3_600, onUs: 18_000_000 }]);
  });
  it('takes the worst of a draw', () => {
    const text = sections({
      draws: 'size: 2 or 4 or 6 uL, every lap',
      rules: 'r:\n  when: lick\n  do: give size\n  limit: 10 per session',
    });
    expect(of(text).waterNl).toBe(60_000);
  });
  it("is never more than the rig's own count or duty", () => {
    const text = sections({
      rules: 'r:\n  when: lick\n  do: pulse gate for 10 ms\n  limit: at least 2 s apart',
    });
    expect(of(text).outputs).toEqual([{ output: 'gate', pulses: 100, onUs: 1_000_000 }]);
  });
  it('is that of the water that ends the session, and of the drops under way', () => {
    expect(bounds(session('01-fixed-place.yaml'), RIG).waterNl).toBe(1_004_000);
  });
  it('is endless where nothing bounds it', () => {
    const most = of(
      rule('lick', 'pulse laser for 5 ms').replace(
        'time >= 60 min',
        'firings of r this session >= 1000000000 and still',
      ),
    );
    expect(most.rules[0]!.firings).toBe(Infinity);
  });
  it('follows a rule that another one fires', () => {
    const text = sections({
      rules:
        'r:\n  when: lick\n  do: note\n  limit: 7 per session\nq:\n  when: 1 s after r fires\n  do: pulse laser for 5 ms',
    });
    expect(of(text).rules[1]).toMatchObject({ firings: 7, because: 'the firings of r' });
  });
});

describe('explain', () => {
  it.each(readdirSync(SESSIONS).filter((name) => /^\d.*\.yaml$/.test(name)))(
    'tells every rule and phase of %s',
    (name) => {
      const file = session(name);
      const text = explain(file, RIG);
      for (const { name: ref } of [...file.rules, ...file.phases, ...file.draws])
        expect(text).toContain(ref.name);
      expect(text).toContain('The most that a session of one cell can deliver');
      expect(text).not.toMatch(/undefined|NaN|Infinity|\[object/);
    },
  );
  it('tells what a place is in each phase', () => {
    const text = explain(session('02-place-moved.yaml'), RIG);
    expect(text).toContain(
      '1. first: for 50 whole laps, then moved.\n     - water: reaches spot: give 4 uL (spot is 60 cm)',
    );
    expect(text).toContain(
      '2. moved: for 50 whole laps, then the session ends.\n     - water: reaches spot: give 4 uL (spot is 140 cm)',
    );
  });
  it('tells a rule with all its keys', () => {
    const text = explain(session('06-induction-sham.yaml'), RIG);
    expect(text).toContain(
      [
        '  induce',
        'When: reaches target (target is 45 cm).',
        'Only if phase is induction and speed >= 8 cm/s, read at that moment.',
        'It does: pulse laser for 300 ms.',
        'A sham, which drives no output, when kind is sham.',
        'Limits: 1 per lap, 10 per session.',
        'An output starts within 1 cm or not at all.',
        'Started by the board itself (armed).',
        'At most: 10 firings (by its limits); 10 pulses of laser, 3 s on.',
      ].join('\n    '),
    );
  });
  it('tells what the rig must provide', () => {
    const text = explain(session('10-external-trigger.yaml'));
    for (const need of [
      'One valve.',
      'An output `marker`.',
      'An output `sync`.',
      'An input `spikes`.',
    ])
      expect(text).toContain(need);
    expect(text).not.toContain('lick sensor');
    expect(explain(session('04-operant.yaml'))).toContain('A lick sensor.');
  });
  it('tells who starts a rule, and why', () => {
    expect(explain(session('04-operant.yaml'), RIG)).toContain(
      'Started by the host: its moment is no place.',
    );
  });
  it('tells what the operator may change, and when it counts', () => {
    expect(explain(session('07-light-through-span.yaml'), RIG)).toContain(
      'light_at: 20 to 140 cm, at first 45 cm; a change counts as the next lap begins.',
    );
  });
});
