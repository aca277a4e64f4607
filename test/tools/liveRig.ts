import { type ChildProcess, spawn } from 'node:child_process';
import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { LocalClient } from '../../server/loop/localClient.js';
import type { Snapshot } from '../../server/loop/protocol.js';
import { type RigAddress, rigAddress } from '../../server/loop/rigLock.js';
import { packageRoot } from '../../server/packageRoot.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { PtyRig } from './ptyRig.js';

/** A short belt, so that laps come every second or two in real time. */
const BELT_CM = 30;
const COUNTS_PER_CM = 25;

export interface LiveRigOptions {
  readonly rules: string;
  /** More lines for the simulated rig's command line. */
  readonly simulated?: readonly string[];
  /** More lines for the rig file. */
  readonly rigMore?: string;
  readonly recordFolder?: string;
  readonly web?: boolean;
}

let made = 0;

/**
 * A whole Lapwing on a simulated rig, as a user runs it: `lapwing run` in a process of its own, on a
 * real pseudo-terminal, in real time. The belt is 30 cm long and driven at a steady speed.
 */
export class LiveRig {
  readonly folder = mkdtempSync(join(tmpdir(), 'lapwing-live-'));
  readonly name = `live ${process.pid} ${++made}`;
  readonly rigPath = join(this.folder, 'rig.yaml');
  readonly rulesPath = join(this.folder, 'rules.yaml');
  readonly recordFolder: string;
  readonly events: StampedDecision[] = [];
  readonly address: RigAddress = rigAddress(this.name);
  state: Snapshot | undefined;
  output = '';
  status: number | null = null;
  #client: LocalClient | undefined;
  #run: ChildProcess | undefined;

  private constructor(
    readonly simulated: PtyRig,
    readonly port: string,
    options: LiveRigOptions,
  ) {
    this.recordFolder = options.recordFolder ?? join(this.folder, 'records');
    writeFileSync(this.rigPath, this.#rigText(options.rigMore ?? ''));
    writeFileSync(this.rulesPath, options.rules);
  }

  static async start(options: LiveRigOptions): Promise<LiveRig> {
    const link = join(mkdtempSync(join(tmpdir(), 'lapwing-port-')), 'board');
    const simulated = await PtyRig.start([
      ...['--link', link, '--belt-cm', String(BELT_CM), '--counts-per-cm', String(COUNTS_PER_CM)],
      ...['--valve-dead-us', '8000', '--valve-us-per-ul', '12000', '--slip-mm', '0'],
      ...(options.simulated ?? []),
    ]);
    await simulated.say('speed 30');
    return new LiveRig(simulated, link, options);
  }

  #rigText(more: string): string {
    return `rig: ${this.name}
board:
  port: ${this.port}
belt:
  length: ${BELT_CM} cm
  counts_per_cm: ${COUNTS_PER_CM}
  seam:
    input: seam
inputs:
  lick:
    line: 0
    use: lick
  seam:
    line: 1
outputs:
  valve:
    line: 0
    kind: valve
    longest_on: 250 ms
    least_gap: 10 ms
    on_silence: finish
    calibration:
      dead: 8 ms
      per_uL: 12 ms
      from: 1 uL
      to: 12 uL
  gate:
    line: 1
    kind: stimulus
    longest_on: 500 ms
    least_gap: 10 ms
water:
  per_session: 1 mL
  per_day: 2 mL
  largest_drop: 12 uL
${more}`;
  }

  /** Starts `lapwing` with these arguments; `RIG` and `RULES` stand for this rig's files. */
  lapwing(...args: readonly string[]): ChildProcess {
    const child = lapwing(
      ...args.map((arg) => arg.replace(/^RIG$/, this.rigPath).replace(/^RULES$/, this.rulesPath)),
    );
    for (const stream of [child.stdout!, child.stderr!]) {
      stream.on('data', (bytes: Buffer) => {
        this.output += bytes.toString('utf8');
      });
    }
    return child;
  }

  /** `lapwing run` with this rig and its rules. */
  run(...more: readonly string[]): ChildProcess {
    const records = ['--records', this.recordFolder, '--subject', 'm1', '--seed', 'twelve'];
    const child = this.lapwing('run', 'RULES', '--rig', 'RIG', ...records, ...more);
    this.#run = child;
    return child;
  }

  get client(): LocalClient {
    return this.#client!;
  }

  /** Sends the running command a signal and waits until it has left. */
  async end(signal: NodeJS.Signals): Promise<void> {
    const child = this.#run!;
    const left = new Promise<number | null>((resolve) => child.once('close', resolve));
    child.kill(signal);
    this.status = await left;
  }

  /** Takes a command that was started otherwise for the one that runs this rig. */
  adopt(child: ChildProcess): void {
    this.#run = child;
  }

  /** Kills the launcher and the loop, as a machine that dies would. */
  async killAll(): Promise<void> {
    // Stopped first: it must not start the loop again, nor the loop end its session in order.
    this.#run!.kill('SIGSTOP');
    this.signalLoop('SIGKILL');
    await this.end('SIGKILL');
  }

  /** Sends this rig's loop process a signal. */
  signalLoop(signal: NodeJS.Signals): void {
    process.kill(processOf('loopProcess.js', this.rigPath), signal);
  }

  /** Sends this rig's web process a signal. */
  signalWeb(signal: NodeJS.Signals): void {
    process.kill(processOf('webProcess.js', this.address.socketPath), signal);
  }

  ruleFirings(rule: string): number {
    return this.state?.rules.find(({ name }) => name === rule)?.firings ?? 0;
  }

  /** The board's outputs as they truly are, bit n for output n. */
  async outputs(): Promise<number> {
    return (await this.simulated.state()).outputs as number;
  }

  /** How often an output has truly risen. */
  async rises(output: number): Promise<number> {
    return ((await this.simulated.state()).rises as number[])[output]!;
  }

  /** Every decision in the session's record. */
  async recorded(): Promise<StampedDecision[]> {
    const decisions: StampedDecision[] = [];
    const reader = await readRecord(this.session);
    reader.visit({ decision: (decision) => decisions.push(decision) });
    return decisions;
  }

  /** Watches the loop's state and events. */
  watch(): LocalClient {
    const { socketPath, tokenFile } = this.address;
    this.#client = new LocalClient({
      ...{ socketPath, tokenFile, client: 'a test' },
      callbacks: {
        state: (state) => {
          this.state = state;
        },
        events: (events) => {
          for (const { event } of events) this.events.push(event);
        },
      },
    });
    this.#client.watch(50);
    this.#client.start();
    return this.#client;
  }

  /** The one session folder. */
  get session(): string {
    const [name] = readdirSync(this.recordFolder);
    return join(this.recordFolder, name!);
  }

  async stop(): Promise<void> {
    this.#client?.close();
    if (this.#run?.exitCode === null) this.#run.kill('SIGKILL');
    await this.simulated.stop();
    rmSync(this.folder, { recursive: true, force: true });
  }
}

/** The process that runs a script with an argument that holds this text (Linux). */
function processOf(script: string, argument: string): number {
  for (const pid of readdirSync('/proc').filter((name) => /^\d+$/.test(name))) {
    let line = '';
    try {
      line = readFileSync(`/proc/${pid}/cmdline`, 'utf8');
    } catch {
      // It has left meanwhile.
    }
    if (line.includes(script) && line.includes(argument)) return Number(pid);
  }
  throw new Error(`no process runs ${script} for ${argument}`);
}

/** Starts the compiled command line. */
export function lapwing(...args: readonly string[]): ChildProcess {
  const script = join(packageRoot, 'dist/server/main/main.js');
  return spawn(process.execPath, [script, ...args], { stdio: ['ignore', 'pipe', 'pipe'] });
}

/** What a command printed, and the status it left with. */
export function finished(
  child: ChildProcess,
): Promise<{ status: number | null; out: string; err: string }> {
  let out = '';
  let err = '';
  child.stdout!.on('data', (bytes: Buffer) => {
    out += bytes.toString('utf8');
  });
  child.stderr!.on('data', (bytes: Buffer) => {
    err += bytes.toString('utf8');
  });
  return new Promise((resolve) => {
    child.once('close', (status) => resolve({ status, out, err }));
  });
}

/** Waits until something holds; fails with what was waited for. */
export async function until(
  what: string,
  holds: () => boolean,
  withinMs = 30_000,
  detail: () => string = () => '',
): Promise<void> {
  const endMs = performance.now() + withinMs;
  while (!holds()) {
    if (performance.now() > endMs) throw new Error(`waited too long for ${what}. ${detail()}`);
    await new Promise((resolve) => setTimeout(resolve, 20));
  }
}
