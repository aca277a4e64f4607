import { type ChildProcess, spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { packageRoot } from '../../server/packageRoot.js';

const START_MS = 20_000;
const ANSWER_MS = 20_000;

/** The simulated rig's program; LAPWING_DIST names another build than `dist/`. */
export const RIG_SCRIPT = join(
  process.env.LAPWING_DIST ?? join(packageRoot, 'dist'),
  'hardware-sim',
  'simulatedRigProcess.js',
);

type Answer = Record<string, unknown>;

/** A simulated rig in its own process, from `dist/`, on a pseudo-terminal or over TCP. */
export class PtyRig {
  readonly #child: ChildProcess;
  readonly #waiting: ((answer: Answer) => void)[] = [];
  readonly #ended: Promise<number | null>;
  #stderr = '';
  /** What to put into a rig file; another one after `replug` unless it is a link. */
  port = '';

  /** Starts it and waits for its port. @param options its command line, see `--help` */
  static async start(options: readonly string[] = []): Promise<PtyRig> {
    const rig = new PtyRig(options);
    const first = await rig.#next(START_MS, 'to start');
    if (typeof first.port !== 'string') throw new Error(`no port: ${JSON.stringify(first)}`);
    rig.port = first.port;
    return rig;
  }

  private constructor(options: readonly string[]) {
    if (!existsSync(RIG_SCRIPT)) throw new Error(`${RIG_SCRIPT} is missing: run \`npm run build\``);
    this.#child = spawn(process.execPath, [RIG_SCRIPT, ...options], {
      stdio: ['pipe', 'pipe', 'pipe'],
    });
    this.#child.stderr!.on('data', (text) => {
      this.#stderr += text;
    });
    // Writing to one that has ended is no error of the test's own.
    this.#child.stdin!.on('error', () => {});
    createInterface({ input: this.#child.stdout! }).on('line', (line) => {
      this.#waiting.shift()?.(JSON.parse(line) as Answer);
    });
    this.#ended = new Promise((resolve) => {
      this.#child.once('exit', (code) => {
        resolve(code);
        for (const answer of this.#waiting.splice(0)) answer({ error: `ended: ${this.#stderr}` });
      });
    });
  }

  get pid(): number {
    return this.#child.pid!;
  }

  /** Says one command and waits for its answer; fails when the rig refuses it. */
  async say(command: string): Promise<Answer> {
    const answer = this.#next(ANSWER_MS, `to answer ${command}`);
    this.#child.stdin!.write(`${command}\n`);
    const got = await answer;
    if (got.error !== undefined) throw new Error(`the simulated rig: ${got.error}`);
    if (typeof got.port === 'string') this.port = got.port;
    return got;
  }

  unplug(): Promise<Answer> {
    return this.say('unplug');
  }
  replug(): Promise<Answer> {
    return this.say('replug');
  }
  reset(): Promise<Answer> {
    return this.say('reset');
  }
  state(): Promise<Answer> {
    return this.say('state');
  }

  /** Ends it, and waits until it has ended. @returns its exit status */
  async stop(): Promise<number | null> {
    this.#child.stdin!.write('quit\n');
    const late = setTimeout(() => this.#child.kill('SIGKILL'), ANSWER_MS);
    const code = await this.#ended;
    clearTimeout(late);
    return code;
  }

  /** Closes its standard input, as a parent that goes away does. @returns its exit status */
  orphan(): Promise<number | null> {
    this.#child.stdin!.end();
    return this.#ended;
  }

  #next(ms: number, what: string): Promise<Answer> {
    return new Promise((resolve, reject) => {
      const late = setTimeout(() => {
        reject(new Error(`the simulated rig took too long ${what}; it wrote: ${this.#stderr}`));
      }, ms);
      this.#waiting.push((answer) => {
        clearTimeout(late);
        resolve(answer);
      });
    });
  }
}
