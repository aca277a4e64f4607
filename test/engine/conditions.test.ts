import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { answer, type Moment, type World } from './reference.js';
import { rulesOf, Stage } from './stage.js';

/** Random conditions as text, of every kind that the reference reads. */
const span = fc.constantFrom('zone', 'gate', '20 to 60 cm', '150 to 30 cm');
const stretch = fc.constantFrom('this lap', 'this phase', 'this session');
const back = fc.constantFrom('over the last lap', 'over the last 2 laps', 'over the last 700 ms');
const scope = fc.oneof(stretch, back);

const numberTerm = fc.oneof(
  fc.constantFrom('lap', 'phase lap', 'laps since pip fires', 'laps since lick in zone'),
  scope.map((s) => `licks ${s}`),
  fc.tuple(span, scope).map(([p, s]) => `licks in ${p} ${s}`),
  fc.tuple(span, scope).map(([p, s]) => `share of licks in ${p} ${s}`),
  scope.map((s) => `firings of pip ${s}`),
  fc.integer({ min: 0, max: 5 }).map(String),
);
const lengthTerm = fc.oneof(
  fc.constantFrom('position', 'target', 'start of zone', 'end of gate', '12.4 cm'),
  fc.integer({ min: 0, max: 180 }).map((cm) => `${cm} cm`),
);
const timeTerm = fc.oneof(
  fc.constantFrom('time', 'phase time', 'lap time', 'time since lick', 'time since pip fires'),
  fc.integer({ min: 0, max: 9000 }).map((ms) => `${ms} ms`),
);
const speedTerm = fc.oneof(
  fc.constantFrom('speed', '20 cm/s', '4 cm/s', '0 cm/s'),
  scope.map((s) => `mean speed ${s}`),
  fc.tuple(span, scope).map(([p, s]) => `mean speed in ${p} ${s}`),
);
const volumeTerm = fc.oneof(
  scope.map((s) => `water given ${s}`),
  fc.integer({ min: 0, max: 20 }).map((uL) => `${uL} uL`),
);

/** Sums and multiples of like terms. */
function sums(term: fc.Arbitrary<string>): fc.Arbitrary<string> {
  return fc.oneof(
    { weight: 3, arbitrary: term },
    fc.tuple(term, fc.constantFrom('+', '-'), term).map((parts) => parts.join(' ')),
    fc.tuple(term, fc.constantFrom('*', '/'), numberTerm).map((parts) => parts.join(' ')),
    term.map((t) => `(${t} - ${t})`),
  );
}
const compared = fc.oneof(
  ...[numberTerm, lengthTerm, timeTerm, speedTerm, volumeTerm].map((term) => {
    const side = sums(term);
    return fc.oneof(
      fc.tuple(side, fc.constantFrom('<', '<=', '>', '>='), side).map((parts) => parts.join(' ')),
      fc
        .tuple(side, fc.constantFrom('is', 'is not'), term, term)
        .map(([x, is, a, b]) => `${x} ${is} ${a} to ${b}`),
    );
  }),
);
const plain = fc.oneof(
  { weight: 5, arbitrary: compared },
  span.map((p) => `in ${p}`),
  fc.constant('still'),
  fc.constantFrom(
    'phase is one',
    'phase is not two',
    'phase is one or two',
    'spikes is high',
    'spikes is not high',
  ),
  fc
    .tuple(numberTerm, fc.integer({ min: 0, max: 4 }))
    .map(([x, n]) => `${x} is a multiple of ${n}`),
  fc.integer({ min: 0, max: 5 }).map((n) => `lap is ${n} or ${n + 2}`),
);
const { condition } = fc.letrec<{ condition: string; test: string }>((tie) => ({
  test: fc.oneof(
    { weight: 4, arbitrary: plain },
    plain.map((c) => `not ${c}`),
    tie('condition').map((c) => `(${c})`),
    tie('condition').map((c) => `not (${c})`),
  ),
  condition: fc.oneof(
    { maxDepth: 3 },
    tie('test'),
    fc.array(tie('test'), { minLength: 2, maxLength: 3 }).map((terms) => terms.join(' and ')),
    fc.array(tie('test'), { minLength: 2, maxLength: 3 }).map((terms) => terms.join(' or ')),
  ),
}));

/** What the animal does, frame by frame. */
const frame = fc.record({
  step: fc.constantFrom(0, 25, 60, 100, 150, 200, -30),
  lick: fc.constantFrom(true, false, false),
  spike: fc.constantFrom(true, false, false, false),
});

function rulesWith(text: string): string {
  return `
places:
  zone: 85 to 95 cm
  gate: 170 to 10 cm
  target: 45 cm
phases:
  one: until licks this session >= 12
  two: to the end
rules:
  pip:
    when: lick
    if: licks this session is a multiple of 3
    do: give 4 uL
  yes:
    when: every 10 ms
    if: ${text}
    do: note
  no:
    when: every 10 ms
    if: not (${text})
    do: note
`;
}

describe('conditions agree with a slow and obvious reading', () => {
  test('on random conditions and random walks', () => {
    const answered = { yes: 0, no: 0, unknown: 0 };
    fc.assert(
      fc.property(condition, fc.array(frame, { minLength: 60, maxLength: 160 }), (text, walk) => {
        const file = rulesOf(rulesWith(text));
        const wanted = file.rules[1]!.if!;
        const stage = new Stage(file).begin();
        const frames: Moment[] = [momentOf(stage, [], 0, true)];
        let told = stage.deeds.length;
        let given = 0;
        for (const { step, lick, spike } of walk) {
          if (lick) stage.lickAtNextFrame();
          stage.inputAtNextFrame(2, spike);
          const lateWater = given;
          stage.frame(step);
          const deeds = stage.deeds.slice(told);
          told = stage.deeds.length;
          const pips = deeds.filter((d) => d.name === 'pip' && d.what === 'fired').length;
          given = pips * 4000;
          const phaseBegan = deeds.some((d) => d.what === 'phase');
          frames.push(momentOf(stage, new Array(pips).fill('pip'), lateWater, phaseBegan));
          const phase = stage.engine.view().phase!;
          const world: World = { frames, places: PLACES, phase, inputs: { spikes: 2 } };
          const expected = answer(wanted, world);
          const yes = deeds.some((d) => d.name === 'yes' && d.what === 'fired');
          const no = deeds.some((d) => d.name === 'no' && d.what === 'fired');
          const found = yes ? true : no ? false : undefined;
          if (found !== expected) {
            const where = `frame ${frames.length - 1}, lap ${stage.instant.lap}`;
            throw new Error(`${where}: ${text}\n  engine ${found}, reference ${expected}`);
          }
          answered[found === undefined ? 'unknown' : found ? 'yes' : 'no']++;
        }
      }),
      { seed: 7, numRuns: 150, endOnFailure: true },
    );
    // The walk is worth something only if every answer comes up often.
    for (const count of Object.values(answered)) expect(count).toBeGreaterThan(1000);
  });
});

const PLACES = { zone: [85, 95], gate: [170, 10], target: [45, 45] } as const;

function momentOf(
  stage: Stage,
  fired: readonly string[],
  water: number,
  phaseBegan: boolean,
): Moment {
  const i = stage.instant;
  return {
    timeUs: i.nowUs,
    lap: i.lap,
    counts: i.placed ? i.travelTo - Math.floor(i.travelTo / 4500) * 4500 : undefined,
    moved: i.travelTo - i.travelFrom,
    speed: i.speedCmPerS,
    lick: i.lick,
    inputs: i.inputs,
    water,
    fired,
    lapBegan: i.lapBegan,
    phaseBegan,
  };
}
