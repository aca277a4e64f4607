import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { packageRoot } from '../../../server/packageRoot.js';

export interface Programs {
  readonly peer: string;
  readonly echo: string;
  remove(): void;
}

/** Compiles the C programs with gcc into a folder of their own; throws, saying what to install. */
export function compilePrograms(): Programs {
  if (spawnSync('gcc', ['--version']).status !== 0) {
    throw new Error(
      'gcc is missing, so round trips cannot be measured: `sudo apt-get install gcc libc6-dev`',
    );
  }
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-bench-'));
  const compile = (name: string) => {
    const source = path.join(packageRoot, 'test/bench/roundTrip', `${name}.c`);
    const program = path.join(folder, name);
    const made = spawnSync('gcc', ['-O2', '-Wall', '-o', program, source], { encoding: 'utf8' });
    if (made.status !== 0) throw new Error(`gcc refused ${source}:\n${made.stderr}`);
    return program;
  };
  return {
    peer: compile('peer'),
    echo: compile('echo'),
    remove: () => fs.rmSync(folder, { recursive: true, force: true }),
  };
}
