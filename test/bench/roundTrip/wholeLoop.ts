import { spawn } from 'node:child_process';
import fs from 'node:fs';
import net from 'node:net';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { type Contestant, type RunningContestant, running } from './contestants.js';
import { PROBE_INPUT } from './peer.js';
import { Viewers } from './viewers.js';

const MAIN = fileURLToPath(new URL('../../../server/main/main.js', import.meta.url));

/** The probe rises and a mark is asked for; the other rules are there to be evaluated. */
const RULES = `title: Round trip
belt: 180 cm

places:
  target: 45 cm
  zone: 80 to 100 cm

rules:
  answer:
    when: probe rises
    do: pulse marker for 1 ms
  water:
    when: reaches 90 cm
    do: give 4 uL
  lit:
    when: enters zone
    if: speed >= 80 cm/s
    do: pulse light for 10 ms
  again:
    when: reaches target
    if: lap >= 100000
    do: pulse light for 10 ms
  licked:
    when: lick in zone
    do: note
`;

const rigWith = (port: string) => `rig: round-trip-${path.basename(port)}
board:
  port: ${port}
belt:
  length: 180 cm
  counts_per_cm: 25
  seam:
    input: seam
inputs:
  lick:
    line: 0
    use: lick
  seam:
    line: 1
  probe:
    line: ${PROBE_INPUT}
outputs:
  valve:
    line: 0
    kind: valve
    longest_on: 250 ms
    calibration:
      dead: 8 ms
      per_uL: 12 ms
      from: 1 uL
      to: 12 uL
      measured: invented for the bench
  marker:
    line: 4
    kind: mark
    longest_on: 100 ms
  light:
    line: 1
    kind: stimulus
    longest_on: 500 ms
water:
  per_session: 1000 mL
  per_day: 1000 mL
  largest_drop: 12 uL
`;

/** Lapwing itself, recording, with so many dashboards watching (0: no web process at all). */
export function wholeLoop(dashboards: number): Contestant {
  return {
    name: `Lapwing, ${dashboards} dashboards`,
    kind: 'board',
    start: async (pty) => {
      const lapwing = await startLapwing(pty, dashboards > 0);
      if (dashboards === 0) return lapwing;
      const pages = await Viewers.start(lapwing.stream);
      await pages.watch(dashboards);
      return {
        async stop() {
          await pages.stop();
          await lapwing.stop();
        },
      };
    },
  };
}

export interface RunningLapwing extends RunningContestant {
  /** Of the page; nothing is there without it. */
  readonly url: string;
  readonly stream: string;
}

/** A session on this pseudo-terminal, recording; with the page, or with no web process at all. */
export async function startLapwing(pty: string, web: boolean): Promise<RunningLapwing> {
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-bench-'));
  const rig = path.join(folder, 'rig.yaml');
  const rules = path.join(folder, 'rules.yaml');
  fs.writeFileSync(rig, rigWith(pty));
  fs.writeFileSync(rules, RULES);
  const args = ['run', rules, '--rig', rig, '--records', path.join(folder, 'records')];
  const port = web ? await freePort() : 0;
  if (web) args.push('--web', '--port', String(port));
  const child = spawn(process.execPath, [MAIN, ...args], { stdio: ['ignore', 'pipe', 'pipe'] });
  let said = '';
  for (const stream of [child.stdout, child.stderr]) {
    stream.on('data', (text) => {
      said = `${said}${text}`.slice(-4_000);
    });
  }
  const early = (code: number | null) => {
    console.error(`bench: lapwing ended with ${code}; it said:\n${said}`);
  };
  child.once('exit', early);
  const lapwing = running(child, 'SIGINT');
  return {
    url: `http://127.0.0.1:${port}`,
    stream: `ws://127.0.0.1:${port}/api/stream`,
    async stop() {
      child.off('exit', early);
      await lapwing.stop();
      fs.rmSync(folder, { recursive: true, force: true });
    },
  };
}

function freePort(): Promise<number> {
  return new Promise((resolve) => {
    const server = net.createServer().listen(0, '127.0.0.1', () => {
      const { port } = server.address() as net.AddressInfo;
      server.close(() => resolve(port));
    });
  });
}
