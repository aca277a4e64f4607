/** Session folders for tests of the records: descriptions alone, written as the program writes them. */
import { mkdirSync, mkdtempSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type SessionDescription, writeDescription } from '../../../server/session/description.js';

export function recordsFolder(): string {
  return mkdtempSync(join(tmpdir(), 'lapwing-records-'));
}

/** A session that ran for twenty minutes and was found whole, but for what is said otherwise. */
export function describedSession(
  root: string,
  name: string,
  change: Partial<SessionDescription> = {},
): string {
  const folder = join(root, name);
  mkdirSync(folder, { recursive: true });
  const startedAt = change.startedAt ?? '2026-03-04T09:30:00.000+01:00';
  const at = new Date(Date.parse(startedAt) + 20 * 60_000).toISOString();
  writeDescription(folder, {
    ...{ format: 1, name, subject: 'm07', experimenter: 'A. Person', title: 'Water at 90' },
    ...{ protocolNumber: 'P-12', sessionNumber: 3, startedAt, seed: 'abc', calibrations: [] },
    software: { name: 'lapwing', version: '0.1.0' },
    board: { model: 'rig', boardId: 1, firmware: 2, protocol: 1, simulated: false },
    files: [
      {
        ...{ role: 'rules', stored: 'rules.yaml', source: '/home/a/rules/water.yaml' },
        ...{ bytes: 10, sha256: '0'.repeat(64) },
      },
    ],
    ended: { how: 'rules', at, reason: 'time' },
    water: { givenUl: 400, uncertainUl: 0 },
    record: { state: 'whole', messages: 10, lastInput: 9, bytes: 100, missing: [] },
    replay: { identical: true, inputs: 10, decisions: 5, commands: 2 },
    ...change,
  });
  return folder;
}

/** A folder that holds what is given and nothing that describes it. */
export function plainFolder(root: string, name: string, files: Record<string, string>): void {
  mkdirSync(join(root, name), { recursive: true });
  for (const [file, text] of Object.entries(files)) writeFileSync(join(root, name, file), text);
}
