import { createHash, randomBytes } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { open } from 'node:fs/promises';
import { join } from 'node:path';
import { Ajv2020, type ValidateFunction } from 'ajv/dist/2020.js';
import { LapwingError } from '../errors/codes.js';
import { packageRoot } from '../packageRoot.js';
import { syncFolder } from '../session/writeFileWhole.js';
import type { Entry } from './entry.js';

/** The JSON Schema of one entry's file (draft 2020-12). */
export function entrySchemaFile(): string {
  return join(packageRoot, 'server', 'animals', 'entry.schema.json');
}

/** A name that no other entry has or will have: when, by the writer's clock, and 64 random bits. */
export function newId(written: Date): string {
  return `${written.toISOString().replace(/[-:.]/g, '')}-${randomBytes(8).toString('hex')}`;
}

/** The text of an entry's file. */
export function entryText(entry: Entry): string {
  return `${JSON.stringify({ ...entry, sha256: digestOf(entry) }, undefined, 2)}\n`;
}

/** What a file says, or why it is not an entry: torn, altered, or against the schema. */
export function readEntryText(text: string, id: string): Entry | { readonly why: string } {
  let value: Entry & { readonly sha256?: unknown };
  try {
    value = JSON.parse(text) as typeof value;
  } catch {
    return { why: text === '' ? 'it is empty' : 'it stops in the middle' };
  }
  const problem = problemWith(value);
  if (problem !== undefined) return { why: problem };
  const { sha256, ...entry } = value;
  if (digestOf(entry as Entry) !== sha256) return { why: 'it was altered after it was written' };
  if (entry.id !== id) return { why: `it calls itself ${entry.id}` };
  return entry as Entry;
}

/**
 * Writes an entry's file under its own name, which must not be there yet, and makes it last over a
 * power cut. Nothing that is there is ever replaced.
 * @throws LapwingError ANIMALS_ENTRY_BAD for an amount or text out of its range
 */
export async function writeEntryFile(folder: string, entry: Entry): Promise<void> {
  const text = entryText(entry);
  const read = readEntryText(text, entry.id);
  if ('why' in read) throw new LapwingError('animalsEntryBad', `The entry: ${read.why}.`);
  const file = await open(join(folder, `${entry.id}.json`), 'wx', 0o644);
  try {
    await file.writeFile(text);
    await file.sync();
  } finally {
    await file.close();
  }
  try {
    syncFolder(folder);
  } catch {
    // Not every share can sync a folder; the file itself is synced.
  }
}

function digestOf(entry: Entry): string {
  return createHash('sha256').update(JSON.stringify(entry)).digest('hex');
}

let validate: ValidateFunction | undefined;

/** What is against the schema, in words; undefined where nothing is. */
function problemWith(value: unknown): string | undefined {
  validate ??= new Ajv2020({ strict: false }).compile(
    JSON.parse(readFileSync(entrySchemaFile(), 'utf8')) as object,
  );
  if (validate(value)) return undefined;
  const [first] = validate.errors ?? [];
  return `${first?.instancePath || 'it'} ${first?.message}`;
}
