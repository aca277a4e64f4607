import { existsSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

/**
 * The folder that holds Lapwing's package.json, whether this code runs from source or from dist/:
 * files that are not code (schemas, the demo, the built dashboard) are found from here.
 */
export const packageRoot: string = find(dirname(fileURLToPath(import.meta.url)));

/** The version in package.json. */
export const packageVersion: string = (
  JSON.parse(readFileSync(join(packageRoot, 'package.json'), 'utf8')) as { version: string }
).version;

function find(folder: string): string {
  if (existsSync(join(folder, 'package.json'))) return folder;
  const parent = dirname(folder);
  if (parent === folder)
    throw new Error('no package.json above the program: a broken installation');
  return find(parent);
}
