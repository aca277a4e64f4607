import { existsSync, readdirSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { rfc3339 } from '../../session/description.js';
import { diskFree } from '../../session/localDisk.js';
import { type CheckedItem, keepPreflight, type Preflight } from '../../session/preflight.js';
import { listCalibrations } from '../../session/rig/calibration.js';
import type { Rig } from '../../session/rig/rig.js';
import type { Desk } from '../guides/guide.js';
import { CHECKS, type Check, type Facts } from './checks.js';
import { type Finding, failed, thisComputer } from './computer.js';

const TITLE = 'Pre-flight';
const OVERRIDE = 'go on all the same';

/**
 * Goes through the checks with a person, and keeps what was found. What fails is tried again,
 * overridden with a reason, or left as it is: the file says which.
 */
export async function runPreflight(desk: Desk, facts: Facts): Promise<Preflight> {
  const done: CheckedItem[] = [];
  for (const check of CHECKS) done.push(await goThrough(desk, check, facts, done));
  const { model, boardId, simulated } = desk.bench.board;
  const preflight: Preflight = {
    format: 1,
    rig: desk.rig.name,
    madeAt: rfc3339(desk.now()),
    by: desk.by,
    board: { model, boardId, simulated },
    passed: done.every(({ result }) => result !== 'failed'),
    checks: done,
  };
  keepPreflight(desk.rig, preflight);
  const text = preflight.passed
    ? 'Ready. The next session keeps a copy of this.'
    : 'Not ready: something failed. The next session keeps a copy of this.';
  desk.show({ title: TITLE, text, done: 1, pictures: [], checks: done });
  return preflight;
}

async function goThrough(
  desk: Desk,
  check: Check,
  facts: Facts,
  done: readonly CheckedItem[],
): Promise<CheckedItem> {
  const { id, title } = check;
  const show = (text: string, now: readonly CheckedItem[]) =>
    desk.show({ title: TITLE, text, done: done.length / CHECKS.length, pictures: [], checks: now });
  for (;;) {
    show(check.text || `${title}?`, done);
    const finding = await find(check, desk, facts);
    const item: CheckedItem = { id, title, ...finding };
    if (finding.result !== 'failed') return item;
    show(`${title}: ${finding.detail} ${finding.remedy}`, [...done, item]);
    const answer = await desk.ask({
      go: 'Go on',
      fields: [
        {
          ...{ kind: 'choice', name: id, label: 'This failed' },
          ...{ options: ['try again', OVERRIDE, 'leave it failed'], value: 'leave it failed' },
        },
        { kind: 'text', name: `${id}-reason`, label: 'Reason, to go on all the same', value: '' },
      ],
    });
    const reason = String(answer[`${id}-reason`] ?? '').trim();
    if (answer[id] === 'leave it failed') return item;
    // Without a reason nothing is overridden: it is asked again.
    if (answer[id] === OVERRIDE && reason !== '') return { ...item, result: 'overridden', reason };
  }
}

/** A check that cannot be made has failed, with what it said. */
async function find(check: Check, desk: Desk, facts: Facts): Promise<Finding> {
  try {
    return await check.run(desk, facts);
  } catch (error) {
    const { code, remedy } = error as { code?: unknown; remedy?: unknown };
    // The person or the loop ended it: nothing more is to be found.
    if (code !== 'BENCH_WITHHELD' && code !== 'BENCH_BUSY') throw error;
    return failed((error as Error).message, String(remedy ?? ''));
  }
}

/** What this computer says of the rig's folders. */
export function factsOf(rig: Rig, recordFolder = rig.recordFolder): Facts {
  const newestMs = listCalibrations(rig.calibrationsFolder).calibrations.map(({ madeAt }) =>
    Date.parse(madeAt),
  );
  return {
    computer: thisComputer,
    freeBytes: diskFree(nearestFolder(recordFolder)),
    largestBytes: largestSession(recordFolder),
    newest: newestMs.length === 0 ? undefined : new Date(Math.max(...newestMs)),
  };
}

/** A folder that is not there yet will be made on the disk of what is. */
function nearestFolder(folder: string): string {
  return existsSync(folder) ? folder : nearestFolder(join(folder, '..'));
}

/** Bytes of the largest session below a folder, by the files at its top. */
function largestSession(folder: string): number {
  let largest = 0;
  for (const entry of entriesOf(folder)) {
    if (!entry.isDirectory()) continue;
    const session = join(folder, entry.name);
    const bytes = entriesOf(session)
      .filter((file) => file.isFile())
      .reduce((sum, file) => sum + statSync(join(session, file.name)).size, 0);
    largest = Math.max(largest, bytes);
  }
  return largest;
}

function entriesOf(folder: string) {
  try {
    return readdirSync(folder, { withFileTypes: true });
  } catch {
    return [];
  }
}
