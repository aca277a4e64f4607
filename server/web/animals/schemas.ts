/** JSON Schema of what the Animals page's requests may hold, and of what they are answered. */
import { readFileSync } from 'node:fs';
import { entrySchemaFile } from '../../animals/entryFile.js';
import { list, orNull, shape } from '../rules/answerSchemas.js';
import { closed, text } from '../schemas.js';

const { $defs } = JSON.parse(readFileSync(entrySchemaFile(), 'utf8')) as {
  $defs: Record<string, { properties?: Record<string, unknown> }>;
};
const { day, grams, ul } = $defs;

/** A piece of the entries' own schema, with what it refers to in its place. */
function resolved(node: unknown): unknown {
  if (Array.isArray(node)) return node.map(resolved);
  if (typeof node !== 'object' || node === null) return node;
  const { $ref } = node as { $ref?: string };
  if ($ref !== undefined) return resolved($defs[$ref.slice('#/$defs/'.length)]);
  return Object.fromEntries(Object.entries(node).map(([key, value]) => [key, resolved(value)]));
}

const card = closed([], resolved($defs.card!.properties) as Record<string, unknown>);

const animal = text(40, 1);
const said = { by: text(64), at: text(40), note: text(500), sure: { type: 'boolean' } };
const doing = (name: string, required: string[], properties: Record<string, unknown>) =>
  closed(['do', 'animal', ...required], {
    do: { const: name },
    animal,
    by: text(64),
    ...properties,
  });

export const animalsParams = closed(['animal'], { animal });

/** One entry, told apart by what it does. */
export const animalsBody = {
  type: 'object',
  required: ['do'],
  discriminator: { propertyName: 'do' },
  oneOf: [
    doing('add', ['set'], { set: card }),
    doing('change', ['set'], { set: { ...card, minProperties: 1 }, from: day, reason: text(500) }),
    doing('weigh', ['grams'], { grams, ...said }),
    doing('water', ['ul'], { ul, ...said }),
    doing('correct', ['of', 'reason'], { of: text(64, 1), grams, ul, reason: text(500, 1) }),
  ],
} as const;

const string = { type: 'string' } as const;
const number = { type: 'number' } as const;
const integer = { type: 'integer' } as const;
const boolean = { type: 'boolean' } as const;

const troubles = list(shape({ animal: string, what: string }));
const weighed = shape({
  ...{ day: string, at: string, grams: number, percent: orNull(number) },
  level: { enum: ['fine', 'near', 'below', 'unknown'] },
});
const sessionWater = shape(
  {
    ...{ givenUl: number, uncertainUl: number, drops: integer },
    ...{ notLickedUl: number, notLickedDrops: integer, licksUnknown: boolean },
  },
  ['licksUnknown'],
);
const session = shape({
  ...{ session: string, rig: string, at: string, day: string },
  override: orNull(shape({ reason: string, against: list(string) })),
  ...{ water: orNull(sessionWater), endId: orNull(string), correction: orNull(string) },
});
const handWater = shape({
  ...{ id: string, at: string, day: string, by: string, note: string, ul: number },
  ...{ struck: boolean, correction: orNull(string) },
});
const dayWater = shape({
  ...{ day: string, sessions: list(session), byHand: list(handWater), open: list(session) },
  ...{ earnedUl: number, uncertainUl: number, notLickedUl: number, byHandUl: number },
  ...{ targetUl: orNull(number), due: orNull(shape({ leastUl: number, mostUl: number })) },
});
const row = {
  ...{ animal: string, card: { type: 'object' }, today: orNull(weighed), last: orNull(weighed) },
  ...{ water: dayWater, lastSession: orNull(session), evening: string },
};

/** For the description (OpenAPI), by name. */
export const animalsSchemas = {
  AnimalEntry: animalsBody,
  AnimalWritten: shape({ done: { const: true }, id: string }),
  Animals: shape({
    ...{ folder: orNull(string), zone: string, day: string, animals: list(shape(row)), troubles },
  }),
  Animal: shape({
    ...{ ...row, zone: string, day: string, weights: list(weighed), days: list(dayWater) },
    ...{ sessions: list(session), entries: list({ type: 'object' }), troubles },
  }),
} as const;
