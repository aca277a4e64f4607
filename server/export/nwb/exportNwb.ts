import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { ERRORS, type ErrorName, LapwingError } from '../../errors/codes.js';
import { packageRoot } from '../../packageRoot.js';

/**
 * Writes a session as an NWB file in a process of its own. Returns the file's path.
 * @throws LapwingError as `readSession` and `writeNwb` do
 */
export async function exportNwb(
  folder: string,
  file: string,
  progress: (done: number) => void = () => {},
): Promise<string> {
  const child = spawn(process.execPath, [compiledScript(), folder, file], {
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let out = '';
  let last = '';
  let complaint = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => {
    const lines = (out + text).split('\n');
    out = lines.pop()!;
    for (const line of lines) {
      if (line.startsWith('{"done":')) progress((JSON.parse(line) as { done: number }).done);
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
  let line: { path?: string; error?: { code: string; message: string } };
  try {
    line = JSON.parse(last);
  } catch {
    throw new LapwingError('exportFolderBad', `${file}: ${how}. ${complaint}`.trim());
  }
  if (line.path !== undefined) return line.path;
  const { code, message } = line.error!;
  const name = (Object.keys(ERRORS) as ErrorName[]).find((key) => ERRORS[key].code === code);
  throw new LapwingError(name ?? 'exportFolderBad', message);
}

/** Beside this file when it is compiled itself; else (run from source) where the build puts it. */
function compiledScript(): string {
  const beside = fileURLToPath(new URL('./nwbProcess.js', import.meta.url));
  if (existsSync(beside)) return beside;
  return path.join(packageRoot, 'dist', 'server', 'export', 'nwb', 'nwbProcess.js');
}
