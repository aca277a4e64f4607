/** JSON Schema of what the Rig page's routes take. */
import { GUIDES } from '../../calibrate/guides/runGuide.js';

const closed = (required: readonly string[], properties: Record<string, unknown>) => ({
  type: 'object',
  additionalProperties: false,
  required,
  properties,
});
const name = { type: 'string', minLength: 1, maxLength: 80 };

export const rigBodies = {
  attempt: closed(['output', 'widthMs', 'into'], {
    output: name,
    widthMs: { type: 'number', exclusiveMinimum: 0, maximum: 600_000 },
    into: { enum: ['vial', 'spout'] },
  }),
  guide: closed(['guide'], {
    guide: { enum: [...GUIDES] },
    of: { type: 'string', maxLength: 64 },
  }),
  answer: closed(['number', 'answers'], {
    number: { type: 'integer', minimum: 1 },
    answers: {
      type: 'object',
      maxProperties: 20,
      propertyNames: { maxLength: 64 },
      additionalProperties: { type: ['number', 'string'], maxLength: 500 },
    },
  }),
  use: closed(['name'], { name }),
  nothing: closed([], {}),
} as const;

export const rigQueries = {
  bench: closed([], { after: { type: 'string', pattern: '^\\d{1,15}$' } }),
} as const;
