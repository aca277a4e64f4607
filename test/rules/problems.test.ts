import { describe, expect, it } from 'vitest';
import { PROBLEMS, type ProblemCode } from '../../server/rules/problemCodes.js';
import { around, check, found, RIG, sections } from './helpers.js';

/** Every code: a file that has the problem, the words underlined, and one that does not. */
interface Case {
  readonly code: ProblemCode;
  readonly wrong: string;
  readonly words: string;
  readonly right: string;
}
const w = (when: string, more = ''): string => `r:\n  when: ${when}\n  do: give 4 uL${more}`;
const rule = (when: string, more = ''): string => sections({ rules: w(when, more) });
const does = (action: string, more = ''): string =>
  sections({ rules: `r:\n  when: reaches 45 cm\n  do: ${action}${more}` });
const draw = (phrase: string, more: Record<string, string> = {}): string =>
  sections({ draws: `d: ${phrase}`, rules: w('reaches 45 cm', '\n  if: d is x'), ...more });
const lengths = (phrase: string): string =>
  sections({ draws: `d: ${phrase}`, rules: w('reaches d') });
const phases = (text: string, more: Record<string, string> = {}): string =>
  sections({ phases: text, rules: w('reaches 45 cm'), ...more });
const sealed = (phrase: string, more = ''): string =>
  sections({
    draws: `arm: ${phrase}`,
    rules: `r:\n  when: reaches 45 cm\n  sham: arm is sham\n  do: pulse laser for 5 ms${more}`,
  });
const PLAIN = rule('reaches 45 cm');
const onLick = '\n  limit: 1 per lap';

const CASES: readonly Case[] = [
  // Outline.
  { code: 'encoding', wrong: `${PLAIN}# \u0000`, words: '\u0000', right: `${PLAIN}# µm` },
  {
    code: 'tooLarge',
    wrong: around('if', 'lap > 1234567890123456'),
    words: '1234567890123456',
    right: around('if', 'lap > 123456789'),
  },
  {
    code: 'tooDeep',
    wrong: around('if', `${'('.repeat(33)}still${')'.repeat(33)}`),
    words: 'still',
    right: around('if', `${'('.repeat(31)}still${')'.repeat(31)}`),
  },
  {
    code: 'tooMany',
    wrong: sections({ rules: `r:\n  when: lick\n  do:\n${'    - note\n'.repeat(17)}` }),
    words: `${'- note\n      '.repeat(16)}- note`,
    right: sections({ rules: `r:\n  when: lick\n  do:\n${'    - note\n'.repeat(16)}` }),
  },
  {
    code: 'yamlSyntax',
    wrong: 'title: t\nbelt: 180 cm\nrules:\n  r:\n    when: lick: now\n    do: note\n',
    words: ':',
    right: PLAIN,
  },
  {
    code: 'yamlNotAllowed',
    wrong: sections({ values: 'v1: &x 4 uL', rules: w('reaches 45 cm').replace('4 uL', 'v1') }),
    words: '&x',
    right: sections({ values: 'v1: 4 uL', rules: w('reaches 45 cm').replace('4 uL', 'v1') }),
  },
  {
    code: 'unknownKey',
    wrong: rule('reaches 45 cm', '\n  limits: 1 per lap'),
    words: 'limits',
    right: rule('reaches 45 cm', onLick),
  },
  { code: 'missingKey', wrong: sections({ rules: 'r:\n  when: lick' }), words: 'r', right: PLAIN },
  {
    code: 'doubledKey',
    wrong: rule('reaches 45 cm', '\n  if: still\n  if: still'),
    words: 'if',
    right: rule('reaches 45 cm', '\n  if: still'),
  },
  {
    code: 'linesExpected',
    wrong: 'title: t\nbelt: 180 cm\nrules: lick\nend: time >= 1 h\n',
    words: 'rules',
    right: PLAIN,
  },
  { code: 'phraseExpected', wrong: rule('\n    - lick'), words: '- lick', right: PLAIN },
  {
    code: 'badName',
    wrong: sections({ rules: w('lick', onLick).replace('r:', 'my-rule:') }),
    words: 'my-rule',
    right: sections({ rules: w('lick', onLick).replace('r:', 'my_rule:') }),
  },
  {
    code: 'reservedName',
    wrong: sections({ rules: w('lick', onLick).replace('r:', 'lap:') }),
    words: 'lap',
    right: sections({ rules: w('lick', onLick).replace('r:', 'water:') }),
  },
  {
    code: 'nameTwice',
    wrong: sections({ places: 'r: 45 cm', rules: w('reaches 45 cm') }),
    words: 'r',
    right: sections({ places: 'q: 45 cm', rules: w('reaches q') }),
  },
  {
    code: 'badPath',
    wrong: sections({ include: '' }).replace('include:\n  \n', 'include: ../a.yaml\n'),
    words: '../a.yaml',
    right: PLAIN,
  },
  {
    code: 'unreadableFile',
    wrong: sections({ include: '' }).replace('include:\n  \n', 'include: a.yaml\n'),
    words: 'a.yaml',
    right: PLAIN,
  },
  // Phrase.
  { code: 'unexpectedWord', wrong: rule('reachs 45 cm'), words: 'reachs', right: PLAIN },
  {
    code: 'unitMissing',
    wrong: around('if', 'speed > 5'),
    words: '5',
    right: around('if', 'speed > 5 cm/s'),
  },
  {
    code: 'unknownUnit',
    wrong: around('when', 'every 5 seconds'),
    words: 'seconds',
    right: around('when', 'every 5 s'),
  },
  {
    code: 'scopeMissing',
    wrong: around('if', 'licks in zone > 3'),
    words: 'zone ',
    right: around('if', 'licks in zone this lap > 3'),
  },
  {
    code: 'andOrMixed',
    wrong: around('if', 'still and in zone or lap > 3'),
    words: 'or',
    right: around('if', '(still and in zone) or lap > 3'),
  },
  {
    code: 'isNotOr',
    wrong: around('if', 'phase is not probe or first'),
    words: 'or',
    right: around('if', 'phase is not probe'),
  },
  {
    code: 'wrongForm',
    wrong: sections({ places: 'p: 85..95 cm', rules: w('enters p', onLick) }),
    words: '..',
    right: sections({ places: 'p: 85 to 95 cm', rules: w('enters p', onLick) }),
  },
  // Meaning.
  {
    code: 'unknownName',
    wrong: around('when', 'reaches targt'),
    words: 'targt',
    right: around('when', 'reaches target'),
  },
  {
    code: 'wrongKind',
    wrong: around('when', 'reaches zone'),
    words: 'zone',
    right: around('when', 'enters zone'),
  },
  {
    code: 'unitsDiffer',
    wrong: around('if', 'speed > 5 cm'),
    words: '5 cm',
    right: around('if', 'speed > 5 cm / 1 s'),
  },
  {
    code: 'unknownWord',
    wrong: around('if', 'kind is shame'),
    words: 'shame',
    right: around('if', 'kind is sham'),
  },
  {
    code: 'measureInConstant',
    wrong: around('place', 'position + 5 cm'),
    words: 'position',
    right: around('place', 'target + 5 cm'),
  },
  {
    code: 'visitWithoutPlace',
    wrong: around('when', '3rd lick this visit'),
    words: '3rd lick this visit',
    right: around('when', '3rd lick in zone this visit'),
  },
  {
    code: 'outOfRange',
    wrong: around('chance', '120 %'),
    words: '120 %',
    right: around('chance', '100 %'),
  },
  {
    code: 'circle',
    wrong: sections({ values: 'v1: v2 + 1 cm\nv2: v1 + 1 cm', rules: w('reaches v1') }),
    words: 'v1',
    right: sections({ values: 'v1: v2 + 1 cm\nv2: 41 cm', rules: w('reaches v1') }),
  },
  {
    code: 'firingCircle',
    wrong: sections({
      rules: 'ra:\n  when: rb fires\n  do: note\nrb:\n  when: ra fires\n  do: note',
    }),
    words: 'ra',
    right: sections({
      rules: 'ra:\n  when: rb fires\n  do: note\nrb:\n  when: 1 s after ra fires\n  do: note',
    }),
  },
  // Rig.
  {
    code: 'beltDiffers',
    wrong: sections({ belt: '200 cm' }),
    words: '200 cm',
    right: sections({ belt: '180.4 cm' }),
  },
  {
    code: 'rigLacks',
    wrong: does('pulse lazer for 5 ms'),
    words: 'lazer',
    right: does('pulse laser for 5 ms'),
  },
  {
    code: 'actionTooLong',
    wrong: does('pulse laser for 600 ms'),
    words: '600 ms',
    right: does('pulse laser for 500 ms'),
  },
  {
    code: 'pulseFillsPeriod',
    wrong: does('pulse laser for 50 ms at 20 Hz, 3 times'),
    words: '50 ms',
    right: does('pulse laser for 20 ms at 20 Hz, 3 times'),
  },
  {
    code: 'volumeOutOfRange',
    wrong: does('give 20 uL'),
    words: '20 uL',
    right: does('give 12 uL'),
  },
  // Draws.
  {
    code: 'weightsMismatch',
    wrong: draw('x or y, every lap, weighted 1 to 2 to 3'),
    words: 'weighted 1 to 2 to 3',
    right: draw('x or y, every lap, weighted 1 to 2'),
  },
  {
    code: 'blockMismatch',
    wrong: draw('x or y, every lap, in shuffled blocks of 5'),
    words: 'in shuffled blocks of 5',
    right: draw('x or y, every lap, in shuffled blocks of 6'),
  },
  {
    code: 'drawImpossible',
    wrong: lengths('20 to 60 cm, every lap, at least 40 cm from the last'),
    words: 'at least 40 cm from the last',
    right: lengths('20 to 60 cm, every lap, at least 10 cm from the last'),
  },
  {
    code: 'sealedForm',
    wrong: sealed('stim or sham, every lap, sealed'),
    words: 'lap',
    right: sealed('stim or sham, every session, sealed'),
  },
  {
    code: 'sealedSeen',
    wrong: sealed('stim or sham, every session, sealed', '\n  if: arm is stim'),
    words: 'arm',
    right: sealed('stim or sham, every session, sealed'),
  },
  { code: 'offBelt', wrong: rule('reaches 190 cm'), words: '190 cm', right: PLAIN },
  {
    code: 'mixedChoices',
    wrong: sections({
      places: 'near: 40 cm',
      draws: 'd: near or far, every lap',
      rules: w('reaches 45 cm', '\n  if: d is far'),
    }),
    words: 'near or far',
    right: sections({
      places: 'near: 40 cm\nfar: 90 cm',
      draws: 'd: near or far, every lap',
      rules: w('reaches d'),
    }),
  },
  // It can never happen.
  {
    code: 'neverTrue',
    wrong: rule('reaches 45 cm', '\n  if: lap > 5 and lap < 3'),
    words: 'lap > 5 and lap < 3',
    right: rule('reaches 45 cm', '\n  if: lap > 5 and lap < 8'),
  },
  {
    code: 'phaseUnreached',
    wrong: phases('pa: to the end\npb: for 5 laps'),
    words: 'pb',
    right: phases('pa: for 5 laps\npb: for 5 laps'),
  },
  {
    code: 'windowTooLong',
    wrong: phases('pa: for 5 laps\npb: for 6 laps', {
      rules: w('reaches 45 cm', '\n  if: phase is pa and licks over the last 10 laps > 2'),
    }),
    words: 'over the last 10 laps',
    right: phases('pa: for 5 laps\npb: for 6 laps', {
      rules: w('reaches 45 cm', '\n  if: phase is pa and licks over the last 3 laps > 2'),
    }),
  },
  {
    code: 'limitIdle',
    wrong: rule('lick', '\n  limit: at least 5 s apart, 9 per 10 s'),
    words: '9 per 10 s',
    right: rule('lick', '\n  limit: at least 5 s apart, 9 per 10 min'),
  },
  {
    code: 'unusedName',
    wrong: sections({ values: 'drop: 4 uL', rules: w('reaches 45 cm') }),
    words: 'drop',
    right: sections({ values: 'drop: 4 uL', rules: w('reaches 45 cm').replace('4 uL', 'drop') }),
  },
  // It may surprise.
  { code: 'noLimit', wrong: rule('lick'), words: 'r', right: rule('lick', onLick) },
  {
    code: 'sameOutput',
    wrong: sections({ rules: `${w('reaches 45 cm')}\n${w('reaches 45 cm').replace('r:', 'q:')}` }),
    words: 'reaches 45 cm',
    right: sections({
      phases: 'pa: for 5 laps\npb: for 5 laps',
      rules: `${w('reaches 45 cm', '\n  if: phase is pa')}\n${w('reaches 45 cm', '\n  if: phase is pb').replace('r:', 'q:')}`,
    }),
  },
  {
    code: 'endsMidLap',
    wrong: phases('pa: for 5 min\npb: for 5 laps'),
    words: 'pa: for 5 min',
    right: phases('pa: for 5 min, at lap end\npb: for 5 laps'),
  },
  {
    code: 'endsEarly',
    wrong: sections({ end: 'lap >= 20' }),
    words: 'lap >= 20',
    right: sections({ end: 'laps done this session >= 20' }),
  },
  {
    code: 'trueAtStart',
    wrong: sections({ end: 'time since r fires > 5 min' }),
    words: 'time since r fires > 5 min',
    right: sections({ end: 'time since r fires > 5 min and time > 5 min' }),
  },
  {
    code: 'staleDraw',
    wrong: sections({
      draws: 'd: x or y, every firing of q',
      rules: `q:\n  when: lap begins\n  do: note\n${w('2 s after q fires', '\n  if: d is x')}`,
    }),
    words: 'd',
    right: sections({
      draws: 'd: x or y, every firing of q',
      rules: `q:\n  when: lap begins\n  do: note\n${w('q fires', '\n  if: d is x')}`,
    }),
  },
  {
    code: 'blockUnfinished',
    wrong: draw('x or y, every lap, in shuffled blocks of 4', { phases: 'x: for 10 laps' }),
    words: 'in shuffled blocks of 4',
    right: draw('x or y, every lap, in shuffled blocks of 4', { phases: 'x: for 12 laps' }),
  },
  { code: 'oneChoice', wrong: draw('x, every lap'), words: 'x', right: draw('x or y, every lap') },
  {
    code: 'isOnMeasured',
    wrong: around('if', 'position is 45 cm'),
    words: 'position is 45 cm',
    right: around('if', 'position is 44 to 46 cm'),
  },
  // It will fall short.
  {
    code: 'limitBeyondRig',
    wrong: does('pulse gate for 10 ms', '\n  limit: 200 per session'),
    words: '200 per session',
    right: does('pulse gate for 10 ms', '\n  limit: 100 per session'),
  },
  {
    code: 'dutyBeyondRig',
    wrong: sections({ rules: 'r:\n  when: every 2 s\n  do: pulse gate for 500 ms' }),
    words: 'pulse gate for 500 ms',
    right: sections({ rules: 'r:\n  when: every 5 s\n  do: pulse gate for 500 ms' }),
  },
  {
    code: 'outlastsStay',
    wrong: sections({
      places: 'zone: 85 to 95 cm',
      rules: 'r:\n  when: enters zone\n  do: hold lamp, up to 3 s\n  limit: 1 per lap',
    }),
    words: 'hold lamp, up to 3 s',
    right: sections({
      places: 'zone: 85 to 95 cm',
      rules:
        'r:\n  when: enters zone\n  do: hold lamp while in zone, up to 3 s\n  limit: 1 per lap',
    }),
  },
  {
    code: 'withinTooTight',
    wrong: rule('reaches 45 cm', '\n  within: 0.1 mm'),
    words: '0.1 mm',
    right: rule('reaches 45 cm', '\n  within: 1 cm'),
  },
  {
    code: 'nearSeam',
    wrong: rule('reaches 178 cm'),
    words: '178 cm',
    right: rule('reaches 177 cm'),
  },
  {
    code: 'fewChoices',
    wrong: lengths('20 to 120 cm, every lap, at least 40 cm from the last'),
    words: 'at least 40 cm from the last',
    right: lengths('20 to 120 cm, every lap, at least 30 cm from the last'),
  },
  // It may never stop.
  {
    code: 'noEnd',
    wrong: sections({ end: '' }),
    words: 't',
    right: sections({ end: 'time >= 1 h' }),
  },
  {
    code: 'noWayOut',
    wrong: phases('pa: until firings of r this phase >= 10\npb: for 5 laps', {
      rules: w('reaches 45 cm', '\n  limit: 5 per session'),
    }),
    words: 'pa: until firings of r this phase >= 10',
    right: phases('pa: until firings of r this phase >= 5\npb: for 5 laps', {
      rules: w('reaches 45 cm', '\n  limit: 5 per session'),
    }),
  },
  {
    code: 'textLost',
    wrong: sections({ title: 'Mouse #12' }),
    words: '#',
    right: sections({ title: '"Mouse #12"' }),
  },
];

describe('each problem', () => {
  it.each(CASES)('$code is told, with its words', ({ code, wrong, words }) => {
    expect(found(wrong)).toContainEqual(`${code}: ${words}`);
  });
  it.each(CASES)('$code is not told of what is right', ({ code, right }) => {
    const { problems } = check(right);
    expect(problems.filter((problem) => problem.code === code)).toEqual([]);
    // What is right in one way has no error in another.
    expect(problems.filter(({ severity }) => severity === 'error')).toEqual([]);
  });
  it('has a case here or among the tables', () => {
    const covered = new Set<string>([...CASES.map(({ code }) => code), 'badTable', 'tableOrder']);
    expect(Object.keys(PROBLEMS).filter((code) => !covered.has(code))).toEqual([]);
  });
});

describe('problems', () => {
  it('come all at once, of form and of meaning, in the order of the text', () => {
    const text = sections({
      values: 'v1: 4 ul\nv2: speed',
      rules:
        'r:\n  when: reachs 45 cm\n  if: foo > 3\n  do: give 4\nq:\n  when: reaches nowhere\n  do: pulse lazer for 5 ms',
      end: 'time >= 60',
    });
    expect(found(text).map((line) => line.split(':')[0])).toEqual([
      'unknownUnit',
      'measureInConstant',
      'unexpectedWord',
      'unknownName',
      'unitMissing',
      'unknownName',
      'rigLacks',
      'unitMissing',
    ]);
  });
  it('keep a broken name from being called unknown', () => {
    expect(found(sections({ places: 'p: 45 parsecs', rules: w('reaches p') }))).toEqual([
      'unknownUnit: parsecs',
    ]);
  });
  it.each([
    ['a word', around('when', 'reachs target'), 'reaches'],
    ['a name', around('when', 'reaches targt'), 'target'],
    ['a unit', around('when', 'every 5 sec'), 's'],
    ['an output', does('pulse lazer for 5 ms'), 'laser'],
    ['a key', rule('reaches 45 cm', '\n  limits: 1 per lap'), 'limit'],
    ['a word of a draw', around('if', 'kind is stimm'), 'stim'],
    ['a phase', around('if', 'phase is prob'), 'probe'],
    ['a measure', around('if', 'sped > 5 cm/s'), 'speed'],
  ])('tell the nearest of %s', (_, text, nearest) => {
    expect(check(text).problems.map((problem) => problem.nearest)).toContain(nearest);
  });
  it.each([
    ['lap = 5', 'say `is`'],
    ['lap == 5', 'say `is`'],
    ['lap != 5', 'is not'],
    ['lap % 10 is 0', 'is a multiple of'],
    ['speed > 1,5 cm/s', 'decimal point: `1.5 cm/s`'],
    ['position > target-5 cm', 'a space on each side'],
    ['not !in zone', 'say `not`'],
    ['still && in zone', 'say `and`'],
    ['still AND in zone', 'capitals count'],
    ['position is 20-40 cm', '`to` for a range'],
    ['position is 20–40 cm', 'for a range say `to`'],
  ])('show the right form of %s', (phrase, expected) => {
    expect(
      check(around('if', phrase))
        .problems.map((problem) => problem.expected)
        .join(),
    ).toContain(expected);
  });
  it.each([
    ['third lick this lap', '3rd lick'],
    ['3th lick this lap', '3rd'],
  ])('show the right ordinal of %s', (phrase, expected) => {
    expect(check(around('when', phrase)).problems[0]!.expected).toContain(expected);
  });
  it('name the other place involved', () => {
    const [problem] = check(sections({ places: 'r: 45 cm', rules: w('reaches 45 cm') })).problems;
    expect(problem!.also![0]!.note).toContain('places');
  });
  it('say what to say instead of a span where a point belongs', () => {
    const [problem] = check(around('when', 'reaches zone')).problems;
    expect(problem!.expected).toBe('a point: say `enters zone`, or `start of zone`');
  });
  it('say nothing of the rig without a rig', () => {
    expect(found(does('pulse anything for 20 min'), null)).toEqual([]);
  });
  it('let a rule be called like the output it drives', () => {
    expect(found(does('pulse laser for 5 ms').replace('r:', 'laser:'))).toEqual([]);
  });
  it('are not told of a rig with two valves when the valve is named', () => {
    const valve = RIG.outputs.find(({ kind }) => kind === 'valve')!;
    const two = { ...RIG, outputs: [...RIG.outputs, { ...valve, name: 'left', index: 8 }] };
    expect(found(does('give 4 uL'), two)).toEqual(['rigLacks: give 4 uL']);
    expect(found(does('give 4 uL from left'), two)).toEqual([]);
  });
});
