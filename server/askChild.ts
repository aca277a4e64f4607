import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { ERRORS, type ErrorName, LapwingError } from './errors/codes.js';
import { packageRoot } from './packageRoot.js';

/**
 * A compiled script beside the module at `from` (its `import.meta.url`): there when that module is
 * compiled itself; else (run from source) where the build puts it.
 */
export function compiledScript(from: string, name: string): string {
  const beside = fileURLToPath(new URL(name, from));
  if (existsSync(beside)) return beside;
  return path.join(packageRoot, 'dist', path.relative(packageRoot, beside));
}

export interface Question {
  readonly script: string;
  readonly args: readonly string[];
  /** What it is about, and the error to throw when the child dies or names none that is known. */
  readonly about: string;
  readonly failure: ErrorName;
  /** Told `done` of each line `{"done": 0.5}` on the way. */
  readonly progress?: (done: number) => void;
  /** It is killed after so long. */
  readonly timeoutMs?: number;
}

/**
 * Runs a script in a process of its own that prints lines of JSON, the last of them its answer.
 * @throws LapwingError the child's own when it answers `{"error": {code, message}}`, else `failure`
 */
export async function askChild<Answer extends object>(question: Question): Promise<Answer> {
  const { script, args, about, failure, progress, timeoutMs } = question;
  const child = spawn(process.execPath, [script, ...args], {
    stdio: ['ignore', 'pipe', 'pipe'],
    ...(timeoutMs === undefined ? {} : { timeout: timeoutMs, killSignal: 'SIGKILL' }),
  });
  let out = '';
  let last = '';
  let complaint = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => {
    const lines = (out + text).split('\n');
    out = lines.pop()!;
    for (const line of lines) {
      if (line.startsWith('{"done":')) progress?.((JSON.parse(line) as { done: number }).done);
      else last = line;
    }
  });
  child.stderr.setEncoding('utf8').on('data', (text: string) => {
    complaint = (complaint + text).slice(-2000);
  });
  const how = await new Promise<string>((resolve) => {
    child.on('error', (error) => resolve(error.message));
    child.on('close', (code, signal) => resolve(signal ?? `exit status ${code}`));
  });
  let answer: Answer | { readonly error: { readonly code: string; readonly message: string } };
  try {
    answer = JSON.parse(last);
  } catch {
    throw new LapwingError(failure, `${about}: ${how}. ${complaint}`.trim());
  }
  if (!('error' in answer)) return answer;
  const { code, message } = answer.error as { code: string; message: string };
  const name = (Object.keys(ERRORS) as ErrorName[]).find((key) => ERRORS[key].code === code);
  throw new LapwingError(name ?? failure, message);
}
