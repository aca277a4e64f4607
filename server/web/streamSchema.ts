/** The messages of the stream as JSON Schema (2020-12), for the description. Fields may be added. */

const text = { type: 'string' };
const count = { type: 'integer', minimum: 0 };
const yes = { type: 'boolean' };
const object = { type: 'object' };

const told = (name: string, properties: Record<string, object> = {}) => ({
  type: 'object',
  required: ['tell', ...Object.keys(properties)],
  properties: { tell: { const: name }, ...properties },
});

const numbered = {
  type: 'object',
  required: ['number', 'event'],
  properties: {
    number: { type: 'integer', minimum: 1 },
    event: { type: 'object', required: ['kind', 'input', 'boardUs', 'lap'] },
  },
};

export const STREAM_SCHEMA = {
  oneOf: [
    told('welcome', {
      version: { type: 'integer', minimum: 1 },
      lapwing: text,
      you: { $ref: '#/components/schemas/You' },
    }),
    told('controls', { controls: { $ref: '#/components/schemas/Controls' } }),
    told('loop', { state: { enum: ['up', 'away'] }, life: text, reason: text, remedy: text }),
    told('setup', { setup: object }),
    told('state', { state: object }),
    told('events', { events: { type: 'array', minItems: 1, items: numbered } }),
    told('gap', { from: count, to: count }),
    told('quiet', { done: yes, detail: text }),
  ],
} as const;
