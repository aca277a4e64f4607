import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { parseDocument } from 'yaml';
import { packageRoot } from '../../packageRoot.js';

/** One setting of a rig file, and what the schema says of it. */
export interface RigSetting {
  /** From the outside in: `outputs`, `valve`, `longest_on`. */
  readonly path: readonly string[];
  /** As it is written; null where the file leaves it out. */
  readonly value: string | null;
  readonly meaning: string;
}

interface Schema {
  readonly $ref?: string;
  readonly description?: string;
  readonly properties?: Readonly<Record<string, Schema>>;
  readonly additionalProperties?: Schema | boolean;
  readonly else?: Schema;
}

/** Every setting that a rig file has or could have, in the order of the schema. */
export function settingsOf(text: string): RigSetting[] {
  const file = join(packageRoot, 'server/session/rig/rig.schema.json');
  const schema = JSON.parse(readFileSync(file, 'utf8')) as Schema & { $defs: object };
  const content = parseDocument(text, { schema: 'failsafe' }).toJS() as unknown;
  const settings: RigSetting[] = [];
  walk(schema, schema.$defs as Readonly<Record<string, Schema>>, content, [], settings);
  return settings;
}

function walk(
  given: Schema,
  defs: Readonly<Record<string, Schema>>,
  value: unknown,
  path: readonly string[],
  into: RigSetting[],
): void {
  const named = given.$ref && defs[given.$ref.replace('#/$defs/', '')];
  const schema: Schema = named ? { ...named, ...given } : given;
  const isMap = typeof value === 'object' && value !== null && !Array.isArray(value);
  const entries = isMap ? (value as Readonly<Record<string, unknown>>) : {};
  // A valve's line is written out, or the name of a stored one.
  const { properties, additionalProperties } =
    isMap && schema.else ? resolve(schema.else, defs) : schema;
  if (properties !== undefined) {
    for (const [key, part] of Object.entries(properties)) {
      walk(part, defs, entries[key], [...path, key], into);
    }
    return;
  }
  if (typeof additionalProperties === 'object') {
    for (const [key, part] of Object.entries(entries)) {
      walk(additionalProperties, defs, part, [...path, key], into);
    }
    return;
  }
  const written = Array.isArray(value) ? value.join(', ') : value;
  into.push({
    path,
    value: written === undefined ? null : String(written),
    meaning: schema.description ?? '',
  });
}

function resolve(schema: Schema, defs: Readonly<Record<string, Schema>>): Schema {
  return (schema.$ref && defs[schema.$ref.replace('#/$defs/', '')]) || schema;
}
