/**
 * Earlier sessions for the demo's records folder, rehearsed and finished as live ones are, so that
 * whoever looks round finds something to read: `demoSessions RECORDS RIG`, in a process of its own.
 */
import fs from 'node:fs';
import { constants, setPriority } from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { packageRoot } from '../packageRoot.js';
import { describeBoard, rfc3339, updateDescription } from '../session/description.js';
import { prepareRules } from '../session/prepare.js';
import { mend } from '../session/record/mend.js';
import { rehearse } from '../session/rehearsal.js';
import { readRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import { noteReplay } from '../session/selfCheck.js';
import { openSession, waterOf } from '../session/store.js';
import { simulatedRigFor } from './simulatedRigFor.js';

export interface DemoSession {
  readonly subject: string;
  readonly daysAgo: number;
  readonly rules: string;
  readonly trained: boolean;
  readonly minutes: number;
}

/** An animal that learns where water comes within a week, and another that has begun to. */
export const DEMO_SESSIONS: readonly DemoSession[] = [
  { subject: 'sim1', daysAgo: 7, rules: '01-fixed-place.yaml', trained: false, minutes: 20 },
  { subject: 'sim1', daysAgo: 6, rules: '01-fixed-place.yaml', trained: false, minutes: 25 },
  { subject: 'sim2', daysAgo: 4, rules: '01-fixed-place.yaml', trained: false, minutes: 20 },
  { subject: 'sim1', daysAgo: 3, rules: '05-probe-laps.yaml', trained: true, minutes: 25 },
  { subject: 'sim1', daysAgo: 2, rules: '06-induction-sham.yaml', trained: true, minutes: 30 },
  { subject: 'sim2', daysAgo: 1, rules: '04-operant.yaml', trained: true, minutes: 20 },
  { subject: 'sim1', daysAgo: 1, rules: 'demo.yaml', trained: true, minutes: 25 },
];

const DEMO_RULES = path.join(packageRoot, 'hardware-sim/demo/sessions');
const DAY_MS = 86_400_000;
const FIRST_HOUR = 9;

/**
 * Rehearses a session with its record, closes and checks it, and only then puts it into the folder
 * as a whole.
 * @param number which session of its subject this is
 * @returns the session's folder
 */
export async function makeDemoSession(
  records: string,
  rig: Rig,
  demo: DemoSession,
  number: number,
): Promise<string> {
  // The rig file may be a copy that lies elsewhere; the demo's rules lie where they came.
  const rules = prepareRules(path.join(DEMO_RULES, demo.rules), rig);
  const startedAt = new Date(Date.now() - demo.daysAgo * DAY_MS);
  startedAt.setHours(FIRST_HOUR + (demo.subject === 'sim1' ? 0 : 1), 7 * number, 0, 0);
  const seed = `demo-${demo.subject}-${number}`;
  const making = fs.mkdtempSync(path.join(records, '.making-'));
  try {
    const card = {
      ...{ subject: demo.subject, experimenter: 'demo', protocolNumber: 'DEMO-1' },
      ...{ sessionNumber: number, seed, startedAt, waterTodayNl: 0 },
    };
    const { folder, recorder } = openSession(making, rig, rules, card, null, { mode: 'bulk' });
    const { program, file } = rules;
    const setup = { rig, program, title: file.title, seed, waterTodayNl: 0 };
    const animal = { seed: number, trained: demo.trained };
    let endedMs = startedAt.getTime();
    const { core } = rehearse(setup, simulatedRigFor(rig, animal), {
      mostUs: demo.minutes * 60_000_000,
      recorder: {
        sample: (input, message) => recorder.sample(input, message),
        input: (input, what) => {
          recorder.input(input, what);
          if (what.kind === 'link up') {
            updateDescription(folder, { board: describeBoard(what.identity) });
          }
        },
        command: (input, name, message) => recorder.command(input, name, message),
        decision: (decision) => {
          recorder.decision(decision);
          if (decision.kind === 'session ended') endedMs += decision.boardUs / 1000;
        },
        batchEnd: (commanded) => recorder.batchEnd(commanded),
      },
    });
    recorder.close(core.endReason);
    const ended = { how: 'rules', at: rfc3339(new Date(endedMs)), reason: core.endReason } as const;
    updateDescription(folder, { ended, water: waterOf(core) });
    await mend(folder);
    await noteReplay(folder);
    const whole = path.join(records, path.basename(folder));
    fs.renameSync(folder, whole);
    return whole;
  } finally {
    fs.rmSync(making, { recursive: true, force: true });
  }
}

/** Whether the folder is a newcomer's: nobody's sessions are mixed with made ones. */
export function wantsDemoSessions(records: string): boolean {
  try {
    return fs.readdirSync(records).length === 0;
  } catch {
    return true;
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const [records = '', rigPath = ''] = process.argv.slice(2);
  // The demo's own session comes first.
  setPriority(constants.priority.PRIORITY_LOW);
  fs.mkdirSync(records, { recursive: true });
  const rig = readRig(rigPath);
  const counts = new Map<string, number>();
  const parent = process.ppid;
  for (const demo of DEMO_SESSIONS) {
    if (process.ppid !== parent) break;
    const number = (counts.get(demo.subject) ?? 0) + 1;
    counts.set(demo.subject, number);
    await makeDemoSession(records, rig, demo, number);
  }
}
