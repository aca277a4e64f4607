/** The shapes of what the rules editor is told (rulesMessages.ts), for the description. */
const string = { type: 'string' } as const;
const number = { type: 'number' } as const;
const integer = { type: 'integer' } as const;
const boolean = { type: 'boolean' } as const;
export const list = (items: object) => ({ type: 'array', items });
export const shape = (properties: Record<string, object>, optional: readonly string[] = []) => ({
  type: 'object',
  required: Object.keys(properties).filter((key) => !optional.includes(key)),
  properties,
});

const place = {
  ...{ path: string, here: boolean, line: integer, column: integer },
  ...{ from: integer, to: integer },
};
const stretch = shape({
  fromCm: number,
  toCm: number,
  kind: { enum: ['point', 'span', 'somewhere'] },
});
const outlined = shape({
  ...{ name: string, line: integer, from: integer, to: integer, words: string },
  spots: list(stretch),
});
export const orNull = (schema: object) => ({ anyOf: [schema, { type: 'null' }] });

const result = shape({
  ...{ seed: string, sessionS: number, laps: integer, licks: integer, waterUl: number },
  ...{ endedBecause: string, tookS: number, beltCm: number, marksLeftOut: integer },
  rules: list(
    shape({
      ...{ name: string, fired: integer, shams: integer },
      not: list(shape({ why: string, times: integer })),
      medianErrorMm: orNull(number),
      worstErrorMm: orNull(number),
    }),
  ),
  phases: list(shape({ name: string, lap: integer, s: number })),
  raster: list(
    shape({
      lap: integer,
      mm: list(integer),
      kinds: list({
        enum: ['lick', 'artefact', 'water', 'stimulus', 'sham', 'missed', 'withheld'],
      }),
    }),
  ),
});

const spread = shape({
  ...{ least: number, low: number, median: number, high: number, most: number },
  bins: list(integer),
});
const many = shape({
  tookS: number,
  report: shape({
    ...{ title: string, runs: integer, seed: string, animal: string, latency: string },
    ...{ minutes: spread, laps: spread, licks: spread, waterUl: spread, lickShare: orNull(spread) },
    ends: list(shape({ reason: string, runs: integer })),
    endAlternatives: list(shape({ words: string, runs: integer })),
    rules: list(
      shape({
        ...{ name: string, when: string, fired: spread, shams: spread },
        byPhase: list(shape({ phase: string, fired: spread })),
        ...{ runsFired: integer, moments: integer },
        why: list(
          shape({
            kind: { enum: ['if', 'chance', 'limit', 'guard'] },
            ...{ words: string, times: integer, unknown: integer, runs: integer },
          }),
        ),
        ...{ boardMm: orNull(spread), hostMm: orNull(spread) },
      }),
    ),
    phases: list(
      shape({
        ...{ name: string, runsEntered: integer, runsNotLeft: integer, minutes: orNull(spread) },
      }),
    ),
    draws: list(
      shape({
        name: string,
        values: list(shape({ value: string, times: integer, share: number, perRun: spread })),
      }),
    ),
    notes: list(string),
  }),
});

export const rulesSchemas = {
  RulesList: shape({
    files: list(string),
    rig: shape({
      beltCm: number,
      outputs: list(shape({ name: string, kind: string })),
      inputs: list(string),
    }),
  }),
  RulesFile: shape({ path: string, text: string, version: string }),
  Saved: shape({ done: { const: true }, version: string }),
  RulesChecked: shape({
    right: boolean,
    problems: list(
      shape(
        {
          ...place,
          severity: { enum: ['error', 'warning'] },
          code: string,
          message: string,
          expected: string,
          nearest: string,
          also: list(shape({ ...place, note: string })),
        },
        ['expected', 'nearest'],
      ),
    ),
    outline: orNull(
      shape({
        title: string,
        beltCm: number,
        places: list(outlined),
        rules: list(outlined),
        phases: list(outlined),
      }),
    ),
    explain: string,
  }),
  Begun: shape({ done: { const: true }, number: integer }),
  Rehearsal: {
    oneOf: [
      shape({ state: { const: 'none' } }),
      shape({
        ...{ state: { const: 'running' }, number: integer, sessionS: number, mostS: number },
        ...{ runs: integer, runsDone: integer },
      }),
      shape({
        ...{ state: { const: 'failed' }, number: integer },
        ...{ code: string, detail: string, remedy: string },
      }),
      shape({ state: { const: 'cancelled' }, number: integer }),
      shape({ state: { const: 'done' }, number: integer, result }),
      shape({ state: { const: 'many done' }, number: integer, result: many }),
    ],
  },
} as const;
