import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { ERRORS, type ErrorName, LapwingError } from '../../errors/codes.js';
import { packageRoot } from '../../packageRoot.js';
import type { Finished } from './finishRecord.js';

type Line = { finished: Finished } | { error: { code: string; message: string } };

/**
 * Finishes the record of an ended session in a process of its own (`finishRecord`, `mend`), at low
 * priority. Throws as they do, and `RECORD_UNFINISHED` where the process died: the live record is
 * then as it was.
 */
export async function finish(folder: string, script = compiledScript()): Promise<Finished> {
  const child = spawn(process.execPath, [script, folder], { stdio: ['ignore', 'pipe', 'pipe'] });
  let out = '';
  let complaint = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => {
    out += text;
  });
  child.stderr.setEncoding('utf8').on('data', (text: string) => {
    complaint = (complaint + text).slice(-2000);
  });
  const how = await new Promise<string>((resolve) => {
    child.on('error', (error) => resolve(error.message));
    child.on('close', (code, signal) => resolve(signal ?? `exit status ${code}`));
  });
  let line: Line;
  try {
    line = JSON.parse(out) as Line;
  } catch {
    throw new LapwingError('recordUnfinished', `${folder}: ${how}. ${complaint}`.trim());
  }
  if ('finished' in line) return line.finished;
  const { code, message } = line.error;
  const name = (Object.keys(ERRORS) as ErrorName[]).find((key) => ERRORS[key].code === code);
  throw new LapwingError(name ?? 'recordUnfinished', message);
}

/** Beside this file when it is compiled itself; else (run from source) where the build puts it. */
function compiledScript(): string {
  const beside = fileURLToPath(new URL('./finishProcess.js', import.meta.url));
  if (existsSync(beside)) return beside;
  return path.join(packageRoot, 'dist', 'server', 'session', 'record', 'finishProcess.js');
}
