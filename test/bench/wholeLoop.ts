import { type ChildProcess, fork } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { WebSocket } from 'ws';
import type { LoopOptions, LoopReport } from '../../server/loop/options.js';
import { rigAddress } from '../../server/loop/rigLock.js';
import type { Contestant, RunningContestant } from './roundTrip/contestants.js';

const RULES = `title: Answer each probe
belt: 180 cm
rules:
  answer:
    when: probe rises
    do: pulse mark for 1 ms
    limit: 1000000 per session
`;

function rigText(name: string, pty: string): string {
  return `rig: ${name}
board:
  port: ${pty}
belt:
  length: 180 cm
  counts_per_cm: 20
inputs:
  probe:
    line: 2
outputs:
  mark:
    line: 0
    kind: mark
    longest_on: 100 ms
water:
  per_session: 1 mL
  per_day: 1 mL
  largest_drop: 10 uL
`;
}

/** Lapwing itself: link, tracking, rules, guard, record, and a page open in so many browsers. */
export function wholeLoop(dashboards: number): Contestant {
  return {
    name: `whole loop, ${dashboards} dashboards`,
    kind: 'board',
    start: (pty) => startLoop(pty, dashboards),
  };
}

async function startLoop(pty: string, dashboards: number): Promise<RunningContestant> {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-bench-'));
  const name = `bench ${dashboards} ${process.pid}`;
  const rigPath = join(folder, 'rig.yaml');
  const rulesPath = join(folder, 'rules.yaml');
  writeFileSync(rigPath, rigText(name, pty));
  writeFileSync(rulesPath, RULES);
  const options: LoopOptions = {
    rigPath,
    recordFolder: join(folder, 'records'),
    exitWhenEnded: false,
    begin: { rulesPath, subject: 'bench', experimenter: '' },
  };
  const loop = forkServer('../../server/loop/loopProcess.js', [JSON.stringify(options)]);
  await new Promise<void>((resolve, reject) => {
    loop.on('message', (report: LoopReport) => {
      if (report.report === 'ready') resolve();
      else if (report.report === 'failed') reject(new Error(report.message));
    });
    loop.once('exit', (code) => reject(new Error(`the loop left with ${code}`)));
  });
  const guests = dashboards === 0 ? undefined : await openDashboards(name, dashboards);
  return {
    stop: async () => {
      guests?.close();
      const left = new Promise((resolve) => loop.once('exit', resolve));
      loop.kill('SIGTERM');
      await left;
      rmSync(folder, { recursive: true, force: true });
    },
  };
}

async function openDashboards(rig: string, count: number): Promise<{ close(): void }> {
  const { socketPath, tokenFile } = rigAddress(rig);
  const web = forkServer('../../server/web/webProcess.js', [
    ...['--socket', socketPath, '--token-file', tokenFile, '--host', '127.0.0.1', '--port', '0'],
  ]);
  const url = await firstUrl(web);
  const stream = `${url.replace(/^http/, 'ws').replace(/\/$/, '')}/api/stream`;
  const sockets = Array.from({ length: count }, () => {
    const socket = new WebSocket(stream, { origin: new URL(url).origin });
    socket.on('message', () => {});
    socket.on('error', () => {});
    return socket;
  });
  await Promise.all(
    sockets.map((socket) => new Promise((resolve) => socket.once('open', resolve))),
  );
  return {
    close: () => {
      for (const socket of sockets) socket.terminate();
      web.kill();
    },
  };
}

function forkServer(script: string, args: readonly string[]): ChildProcess {
  return fork(fileURLToPath(new URL(script, import.meta.url)), args, {
    stdio: ['ignore', 'pipe', 'inherit', 'ipc'],
  });
}

function firstUrl(web: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    let text = '';
    web.stdout!.on('data', (bytes: Buffer) => {
      text += bytes.toString('utf8');
      const end = text.indexOf('\n');
      if (end >= 0) resolve((JSON.parse(text.slice(0, end)) as { listening: string }).listening);
    });
    web.once('exit', (code) => reject(new Error(`the web process left with ${code}`)));
  });
}
