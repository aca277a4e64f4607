import { existsSync } from 'node:fs';
import { homedir } from 'node:os';
import { join } from 'node:path';
import { packageRoot } from '../packageRoot.js';

const FOLDER = join(packageRoot, 'hardware-sim', 'demo');

/** Rigs that need no file of one's own: an animal on a belt, with a board that is not there. */
const BUILT_IN: Readonly<Record<string, string>> = {
  simulated: join(FOLDER, 'rig.yaml'),
  emulated: join(FOLDER, 'emulated.yaml'),
};

/** @returns the rig file that `--rig` means: a file of that name goes before a rig that comes along */
export function rigFile(given: string): string {
  return existsSync(given) ? given : (BUILT_IN[given] ?? given);
}

/** Where a session's folders go that the rig file would have in the installed package. */
export function foldersFor(rigPath: string): { records?: string; animals?: string } {
  if (!Object.values(BUILT_IN).includes(rigPath)) return {};
  const records = join(homedir(), 'lapwing-demo-records');
  return { records, animals: `${records}-animals` };
}
