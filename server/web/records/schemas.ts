/** JSON Schema of what the Records page's requests may hold, and of what they are answered. */
import { list, orNull, shape } from '../rules/answerSchemas.js';
import { closed, text } from '../schemas.js';
import { EXPORTS } from './recordsMessages.js';

const day = { type: 'string', pattern: '^\\d{4}-\\d\\d-\\d\\d$' } as const;
const sessionName = text(200, 1);

export const recordsParams = closed(['name'], { name: sessionName });

export const recordsQueries = {
  search: closed([], {
    text: text(200),
    subject: text(64),
    title: text(200),
    rules: text(200),
    from: day,
    to: day,
    state: { enum: ['any', 'ended', 'recording', 'trouble'] },
    sort: { enum: ['started', 'subject', 'title', 'minutes', 'water'] },
    order: { enum: ['up', 'down'] },
    // Values in an address are text.
    offset: { type: 'string', pattern: '^\\d{1,7}$' },
    limit: { type: 'string', pattern: '^([1-9]\\d?|1\\d\\d|200)$' },
  }),
  download: closed(['what'], { what: { enum: ['session', 'report', ...EXPORTS] } }),
} as const;

export const recordsBodies = {
  work: {
    type: 'object',
    required: ['do'],
    discriminator: { propertyName: 'do' },
    oneOf: [
      closed(['do'], { do: { enum: ['summary', 'report', 'replay', 'mend'] } }),
      closed(['do', 'to'], { do: { const: 'export' }, to: { enum: EXPORTS } }),
      closed(['do', 'rules'], { do: { const: 'what if' }, rules: text(200, 1) }),
    ],
  },
  compare: closed(['sessions'], {
    sessions: { type: 'array', items: sessionName, minItems: 2, maxItems: 200, uniqueItems: true },
  }),
} as const;

const string = { type: 'string' } as const;
const number = { type: 'number' } as const;
const integer = { type: 'integer' } as const;
const boolean = { type: 'boolean' } as const;

const row = shape({
  ...{ name: string, bad: orNull(string), subject: string, title: string, rules: string },
  ...{ experimenter: orNull(string), protocolNumber: orNull(string), startedAt: string },
  ...{ sessionNumber: orNull(integer), recording: boolean, minutes: orNull(number) },
  ...{ givenUl: orNull(number), uncertainUl: orNull(number), simulated: orNull(boolean) },
  ended: orNull(shape({ how: string, at: string, reason: string })),
  record: { enum: ['whole', 'open', 'torn', 'damaged', null] },
  check: { enum: ['identical', 'different', 'failed', null] },
});
const errors = orNull(shape({ firings: integer, medianMm: number, worstMm: number }));
const made = orNull(shape({ bytes: integer, at: string, old: boolean }));
const firing = shape({
  ...{ timeS: number, lap: integer, rule: string, output: orNull(string) },
  ...{ atCm: orNull(number), placeCm: orNull(number), errorMm: orNull(number) },
  ...{ sham: boolean, armed: boolean },
});
const summary = shape({
  ...{ minutes: number, laps: integer, licks: integer, waterUl: number },
  rules: list(
    shape({
      ...{ name: string, fired: integer, shams: integer, armed: errors, host: errors },
      not: list(shape({ why: string, times: integer })),
    }),
  ),
  firings: list(firing),
  firingsLeftOut: integer,
  notes: list(shape({ timeS: number, text: string })),
});
const job = { id: string, kind: string, about: list(string), askedAt: string };

/** For the description (OpenAPI), by name. */
export const recordsSchemas = {
  SessionList: shape({
    ...{ total: integer, found: integer, rows: list(row), rules: list(string) },
    subjects: list(shape({ subject: string, sessions: integer })),
  }),
  Session: shape({
    row,
    description: orNull({ type: 'object' }),
    recordBytes: integer,
    made: shape({ report: made, tables: made, parquet: made, nwb: made }),
    summary: orNull(summary),
  }),
  Work: recordsBodies.work,
  Compare: recordsBodies.compare,
  JobBegun: shape({ done: { const: true }, job: string }),
  Job: {
    oneOf: [
      shape({ ...job, state: { const: 'waiting' }, ahead: integer }),
      shape({ ...job, state: { const: 'running' }, done: number, doing: string }),
      shape({ ...job, state: { const: 'done' }, tookS: number, result: {} }),
      shape({
        ...{ ...job, state: { const: 'failed' } },
        ...{ code: string, detail: string, remedy: string },
      }),
      shape({ ...job, state: { const: 'cancelled' } }),
    ],
  },
  JobList: shape({ jobs: list({ $ref: '#/components/schemas/Job' }) }),
} as const;
