import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach } from 'vitest';
import type { Entry, Fact } from '../../server/animals/entry.js';
import { historyOf } from '../../server/animals/history.js';

const folders: string[] = [];

afterEach(() => {
  for (const folder of folders.splice(0)) rmSync(folder, { recursive: true, force: true });
});

export function newFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-animals-'));
  folders.push(folder);
  return folder;
}

let made = 0;

/** An entry of m31 as a computer would have written it, one step after another. */
export function entry(fact: Fact, more: Partial<Entry> = {}): Entry {
  const step = ++made;
  return {
    ...{ format: 1, id: `20261201T120000000Z-${step.toString(16).padStart(16, '0')}` },
    ...{ animal: 'm31', step, written: '2026-12-01T12:00:00.000+00:00' },
    ...{ computer: 'rig-a', by: 'kl' },
    ...fact,
    ...more,
  } as Entry;
}

export const weight = (at: string, grams: number) => entry({ kind: 'weight', at, grams });
export const handWater = (at: string, ul: number) => entry({ kind: 'water', at, ul });

export function sessionEnded(at: string, givenUl: number, more: object = {}): Entry {
  const water = { givenUl, uncertainUl: 0, drops: 1, notLickedUl: 0, notLickedDrops: 0, ...more };
  const session = `session at ${at}`;
  return entry({ kind: 'session ended', at, session, rig: 'rig a', water });
}

export function history(entries: readonly Entry[], zone = 'UTC') {
  return historyOf('m31', entries, zone);
}
