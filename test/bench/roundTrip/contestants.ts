import { type ChildProcess, fork, spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

/** A host that answers a peer. */
export interface Contestant {
  readonly name: string;
  /** `bare` echoes frames blindly; `board` speaks the wire, and so does its peer. */
  readonly kind: 'bare' | 'board';
  /** Attaches to the pseudo-terminal; resolves once it answers. */
  start(pty: string): Promise<RunningContestant>;
}
export interface RunningContestant {
  stop(): Promise<void>;
}

/** The floor: a few lines of C. */
export function bareC(program: string): Contestant {
  return {
    name: 'bare C echo',
    kind: 'bare',
    start: async (pty) => running(spawn(program, [pty], { stdio: 'inherit' })),
  };
}

/** A plain Node program on serialport's stream. */
export const bareNode: Contestant = {
  name: 'bare Node serialport echo',
  kind: 'bare',
  start: (pty) => forked('./nodeEcho.js', pty),
};

/** Lapwing's link with nothing behind it: what the loop adds is the difference to this. */
export const linkAlone: Contestant = {
  name: 'link alone',
  kind: 'board',
  start: (pty) => forked('./linkEcho.js', pty),
};

/** Forks a compiled program beside this one, which says `ready` to its parent. */
export async function forked(program: string, ...args: string[]): Promise<RunningContestant> {
  const child = fork(fileURLToPath(new URL(program, import.meta.url)), args);
  await new Promise<void>((resolve, reject) => {
    child.once('message', () => resolve());
    child.once('exit', (code) => reject(new Error(`${program} ended with ${code}`)));
  });
  return running(child);
}

export function running(
  child: ChildProcess,
  signal: NodeJS.Signals = 'SIGTERM',
): RunningContestant {
  return {
    stop: () =>
      new Promise((resolve) => {
        if (child.exitCode !== null || child.signalCode !== null) return resolve();
        child.once('exit', () => resolve());
        child.kill(signal);
      }),
  };
}
