/**
 * The loop process: one argument, its options as JSON. It is started by the launcher, reports to it
 * over IPC, and ends its session cleanly when the launcher goes away.
 */
import { pino } from 'pino';
import { asKnown } from '../errors/asKnown.js';
import { readRig } from '../session/rig/readRig.js';
import { Loop } from './loop.js';
import type { LoopOptions, LoopReport } from './options.js';

const CANNOT_RUN = 2;
/** A record that takes longer than this to close is left as it stands: it can be mended. */
const LEAVE_MS = 60_000;

const options = JSON.parse(process.argv[2] ?? '{}') as LoopOptions;
const log = pino(
  { name: 'loop', level: process.env.LAPWING_LOG ?? 'warn' },
  // Written at once: a log line must not be lost with the process, and is never on the frame path.
  pino.destination({ dest: 2, sync: true }),
);

function report(what: LoopReport): void {
  if (process.connected) process.send?.(what);
}

function fail(error: unknown): never {
  const { code, message, remedy } = asKnown(error);
  report({ report: 'failed', code, message, remedy });
  process.exit(CANNOT_RUN);
}

let loop: Loop | undefined;
let leaving = false;

async function leave(reason: string): Promise<void> {
  if (leaving) return;
  leaving = true;
  setTimeout(() => process.exit(1), LEAVE_MS).unref();
  await loop?.close(reason);
  process.exit(process.exitCode ?? 0);
}

process.on('SIGTERM', () => void leave('the program was ended'));
process.on('disconnect', () => void leave('the launcher went away'));
// Ctrl-C is the launcher's: it ends the session in order.
process.on('SIGINT', () => {});

try {
  const rig = readRig(options.rigPath);
  loop = new Loop(rig, options, log, report, () => void leave('done'));
  await loop.start();
} catch (error) {
  fail(error);
}
