/** JSON Schema of every body that the HTTP interface takes. Unknown fields are refused everywhere. */

export const text = (maxLength: number, minLength = 0) => ({
  type: 'string',
  minLength,
  maxLength,
});
export const closed = (required: string[], properties: Record<string, unknown>) => ({
  type: 'object',
  additionalProperties: false,
  required,
  properties,
});
const act = (name: string, properties: Record<string, unknown> = {}) =>
  closed(['act', ...Object.keys(properties)], { act: { const: name }, ...properties });

const name = text(64, 1);
const who = text(64);

/** One operator act, told apart by its `act` (server/session/inputs.ts). */
const operatorAct = {
  type: 'object',
  required: ['act'],
  discriminator: { propertyName: 'act' },
  oneOf: [
    act('press', { button: name }),
    act('choose', { name, value: { type: ['number', 'string'], maxLength: 64 } }),
    act('hold', { what: { enum: ['stimulus', 'water'] }, on: { type: 'boolean' } }),
    act('phase', { to: name }),
    act('new cell', {
      fields: {
        type: 'object',
        maxProperties: 16,
        propertyNames: { maxLength: 64 },
        additionalProperties: text(200),
      },
    }),
    act('exclude lap', { lap: { type: 'integer', minimum: 0, maximum: 1_000_000 } }),
    {
      ...act('note', { text: text(2000, 1) }),
      properties: {
        ...act('note', { text: text(2000, 1) }).properties,
        mark: { type: 'integer', minimum: 1 },
      },
    },
    act('mark'),
    act('ask', { rule: name, laps: { type: 'integer', minimum: 0, maximum: 1000 } }),
    act('withdraw', { rule: name }),
    act('put off', {
      laps: { type: 'integer', minimum: 0, maximum: 25 },
      minutes: { type: 'integer', minimum: 0, maximum: 25 },
    }),
    act('acknowledge', { alarm: name }),
    act('stop everything'),
    act('allow stimulation'),
    act('hand on belt', { on: { type: 'boolean' } }),
    act('end', { reason: text(200) }),
  ],
} as const;

export const bodies = {
  begin: closed(['rules', 'subject'], {
    rules: text(200, 1),
    subject: text(64, 1),
    experimenter: text(64),
    protocolNumber: text(64),
    sessionNumber: { type: 'integer', minimum: 1, maximum: 1_000_000 },
    seed: text(64),
    despite: text(500),
  }),
  act: closed(['act'], { act: operatorAct, who }),
  end: closed([], { reason: text(200) }),
  quiet: closed([], {}),
  signIn: closed(['name', 'secret'], { name: text(64, 1), secret: text(128, 1) }),
  signOut: closed([], { everywhere: { type: 'boolean' } }),
  controls: closed(['take'], {
    take: { type: 'boolean' },
    seen: { type: 'integer', minimum: 0, maximum: Number.MAX_SAFE_INTEGER },
  }),
  checkRules: closed(['text'], { text: text(256 << 10), path: text(200, 1) }),
  saveRules: closed(['path', 'text'], {
    path: text(200, 1),
    text: text(256 << 10),
    version: text(64),
  }),
  rehearse: closed(['text'], {
    text: text(256 << 10),
    path: text(200, 1),
    seed: text(64),
    animalSeed: { type: 'integer', minimum: 0, maximum: 2 ** 31 - 1 },
    trained: { type: 'boolean' },
    minutes: { type: 'integer', minimum: 1, maximum: 240 },
    runs: { type: 'integer', minimum: 1, maximum: 1000 },
  }),
} as const;

export const queries = {
  rulesFile: closed(['path'], { path: text(200, 1) }),
} as const;
