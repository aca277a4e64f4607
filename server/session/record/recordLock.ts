import fs from 'node:fs';
import path from 'node:path';
import { LapwingError } from '../../errors/codes.js';

const NAME = 'recording.lock';

/** When the process began, in the kernel's ticks: tells a process from a later one of its number. */
function startOf(pid: number): string {
  try {
    // proc_pid_stat(5): field 22, counted behind the parenthesised name.
    const stat = fs.readFileSync(`/proc/${pid}/stat`, 'utf8');
    return stat.slice(stat.lastIndexOf(')') + 2).split(' ')[19] ?? '';
  } catch {
    return '';
  }
}

function alive(pid: number, start: string): boolean {
  try {
    process.kill(pid, 0);
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'EPERM') return false;
  }
  return startOf(pid) === start;
}

/** The process that is recording into the folder now; undefined when none is. */
export function recordingProcess(folder: string): number | undefined {
  let text: string;
  try {
    text = fs.readFileSync(path.join(folder, NAME), 'utf8');
  } catch {
    return undefined;
  }
  const [pid, start] = text.trim().split(' ');
  return alive(Number(pid), start ?? '') ? Number(pid) : undefined;
}

/** Throws `RECORD_BUSY` while another process records into the folder. */
export function refuseWhileRecording(folder: string): void {
  const pid = recordingProcess(folder);
  if (pid === undefined) return;
  throw new LapwingError('recordBusy', `${folder} is being recorded by process ${pid}.`);
}

export function lockRecord(folder: string): void {
  refuseWhileRecording(folder);
  fs.writeFileSync(path.join(folder, NAME), `${process.pid} ${startOf(process.pid)}\n`);
}

export function unlockRecord(folder: string): void {
  fs.rmSync(path.join(folder, NAME), { force: true });
}
