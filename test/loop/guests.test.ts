import { execFileSync } from 'node:child_process';
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { connect } from 'node:net';
import { join } from 'node:path';
import { setTimeout as delay } from 'node:timers/promises';
import { afterEach, describe, expect, it } from 'vitest';
import { WebSocket } from 'ws';
import { quietOnce } from '../../server/loop/localClient.js';
import { readDescription } from '../../server/session/description.js';
import { finished, LiveRig, type LiveRigOptions, lapwing, until } from '../tools/liveRig.js';

const RULES = `title: Guests
belt: 30 cm
rules:
  water:
    when: reaches 15 cm
    do: give 1 uL
    limit: 1 per lap
  gate:
    when: reaches 25 cm
    do: pulse gate for 20 ms
    limit: 1 per lap
end: laps done this session >= 400
`;

let rig: LiveRig | undefined;
afterEach(async () => {
  await rig?.stop();
  rig = undefined;
});

async function started(
  more: readonly string[] = [],
  options: Partial<LiveRigOptions> = {},
): Promise<LiveRig> {
  rig = await LiveRig.start({ rules: RULES, ...options });
  rig.watch();
  const child = rig.run(...more);
  const on = () => child.exitCode !== null || (rig!.state?.lap ?? 0) >= 1;
  await until('the first lap', on, 60_000, () => rig!.output);
  expect(child.exitCode, rig.output).toBeNull();
  return rig;
}

async function replaysIdentically(folder: string): Promise<void> {
  const { out, err } = await finished(lapwing('replay', folder));
  expect(out + err).toContain('identical');
}

describe('the web process', { timeout: 120_000 }, () => {
  it('can be flooded, frozen and killed, and no frame is lost and no decision changed', async () => {
    const live = await started(['--web', '--port', '0']);
    await until(
      'the page',
      () => /dashboard: http/.test(live.output),
      30_000,
      () => live.output,
    );
    const url = /dashboard: (http\S+)/.exec(live.output)![1]!.replace(/\/$/, '');
    const stream = `${url.replace('http', 'ws')}/api/stream`;
    // Twenty pages, some of which never read.
    const sockets = Array.from({ length: 20 }, (_, index) => {
      const socket = new WebSocket(stream, { origin: url });
      socket.on('error', () => {});
      if (index % 4 === 0) socket.on('open', () => socket.pause());
      return socket;
    });
    const lap = live.state!.lap;
    for (let i = 0; i < 200; i++) {
      await fetch(`${url}/api/state`)
        .then((answer) => answer.arrayBuffer())
        .catch(() => {});
    }
    live.signalWeb('SIGKILL');
    await until('the page to be back', () => live.output.includes('web process killed'));
    await until('more laps', () => live.state!.lap >= lap + 3, 30_000);
    expect(live.state!.link.lostFrames).toBe(0);
    expect(live.state!.link.badFrames).toBe(0);
    for (const socket of sockets) socket.terminate();
    await live.end('SIGINT');
    const links = (await live.recorded()).filter((event) => event.kind === 'link');
    expect(links).toHaveLength(1);
    await replaysIdentically(live.session);
  });
});

describe('the local socket', { timeout: 120_000 }, () => {
  it('lets nobody in without the token, and drops who floods it, while the session goes on', async () => {
    const live = await started();
    const { socketPath, tokenFile } = live.address;
    await expect(quietOnce({ socketPath, token: 'guessed' })).rejects.toMatchObject({
      code: 'LOOP_TOKEN_REFUSED',
    });
    const answer = await new Promise<string>((resolve) => {
      let text = '';
      const socket = connect(socketPath);
      socket.on('data', (bytes) => {
        text += bytes.toString('utf8');
      });
      socket.on('error', () => {});
      socket.on('close', () => resolve(text));
      socket.write('x'.repeat(200_000));
    });
    expect(answer).toContain('LOOP_GARBLED');
    // A client that watches and never reads is told of the gap or dropped, and holds nobody up.
    const frozen = connect(socketPath);
    frozen.on('error', () => {});
    frozen.pause();
    const token = readFileSync(tokenFile, 'utf8');
    frozen.write(`${JSON.stringify({ say: 'hello', token, client: 'frozen' })}\n`);
    frozen.write(`${JSON.stringify({ say: 'watch', hz: 50, after: 0 })}\n`);
    const lap = live.state!.lap;
    await until('more laps', () => live.state!.lap >= lap + 2);
    frozen.destroy();
    expect(live.state!.link.lostFrames).toBe(0);
    await live.end('SIGINT');
  });

  it('sets every output idle and holds them on `lapwing quiet`, and the record goes on', async () => {
    const live = await started();
    const { status, out } = await finished(live.lapwing('quiet', '--rig', 'RIG'));
    expect(status).toBe(0);
    expect(out).toContain('all outputs idle');
    await until('the hold', () => live.state?.held.water !== null);
    const before = [await live.rises(0), await live.rises(1)];
    const lap = live.state!.lap;
    await until('two laps', () => live.state!.lap >= lap + 2);
    expect([await live.rises(0), await live.rises(1)]).toEqual(before);
    expect(await live.outputs()).toBe(0);
    expect(live.state!.record.state).toBe('writing');
    await live.end('SIGINT');
    const decisions = await live.recorded();
    expect(decisions.some((d) => d.kind === 'operator' && d.act.act === 'stop everything')).toBe(
      true,
    );
    await replaysIdentically(live.session);
  });
});

describe('a second loop on the same rig', { timeout: 120_000 }, () => {
  it('is refused, and the first is untouched', async () => {
    const live = await started();
    const { status, err } = await finished(
      lapwing('run', live.rulesPath, '--rig', live.rigPath, '--records', join(live.folder, 'b')),
    );
    expect(status).not.toBe(0);
    expect(err).toContain('LOOP_RIG_TAKEN');
    expect(existsSync(join(live.folder, 'b'))).toBe(false);
    const lap = live.state!.lap;
    await until('more laps', () => live.state!.lap >= lap + 2);
    expect(live.state!.link.lostFrames).toBe(0);
    await live.end('SIGINT');
  });

  it('takes over a socket whose loop is dead, and tells of the session that it left', async () => {
    const live = await started();
    // The launcher first, so that it does not start the loop again.
    const left = live.killAll();
    await left;
    const again = await finished(
      lapwing('run', live.rulesPath, '--rig', live.rigPath, '--records', live.recordFolder),
    );
    expect(again.status).not.toBe(0);
    expect(again.err).toContain('LOOP_UNFINISHED');
    const mended = await finished(lapwing('mend', live.session));
    expect(mended.status).toBe(0);
    expect(readDescription(live.session).ended?.how).toBe('mended');
    await replaysIdentically(live.session);
  });

  it('goes on with the session that it left when asked to resume', async () => {
    const live = await started();
    await live.killAll();
    const lap = live.state!.lap;
    const child = live.lapwing('resume', '--rig', 'RIG');
    live.adopt(child);
    live.state = undefined;
    await until(
      'the session again',
      () => (live.state?.lap ?? 0) > lap,
      30_000,
      () => live.output,
    );
    await live.end('SIGINT');
    await replaysIdentically(live.session);
  });
});

describe('a full disk', { timeout: 120_000 }, () => {
  it.each(['water goes on', 'water stops'])(
    'is warned of early, ends stimulation and keeps the loop; %s',
    async (whenFull) => {
      // A small file system of its own needs root, which CI has.
      expect(process.getuid?.(), 'this test mounts a small disk: run it as root').toBe(0);
      const disk = join('/tmp', `lapwing-small-disk-${process.pid}`);
      mkdirSync(disk, { recursive: true });
      execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=2m', 'tmpfs', disk]);
      try {
        const live = await started([], {
          recordFolder: join(disk, 'records'),
          rigMore: `record:\n  when_full: ${whenFull}\n`,
        });
        await until('the warning', () => live.output.includes('MB left on the disk'));
        expect(live.state!.held.stimulus).toBeNull();
        writeFileSync(join(disk, 'filler'), Buffer.alloc(1_000_000));
        let filled = 1_000_000;
        for (let n = 0; filled < 2_000_000; n++) {
          try {
            writeFileSync(join(disk, `filler-${n}`), Buffer.alloc(16_384));
            filled += 16_384;
          } catch {
            break;
          }
        }
        await until(
          'the hold',
          () => live.state?.held.stimulus != null,
          60_000,
          () => live.output,
        );
        expect(live.state!.held.stimulus).toMatch(/disk/);
        // What had begun is over.
        await delay(200);
        const [valve, gate] = [await live.rises(0), await live.rises(1)];
        const lap = live.state!.lap;
        await until('more laps', () => live.state!.lap >= lap + 3);
        expect(await live.rises(1)).toBe(gate);
        if (whenFull === 'water goes on') {
          expect(live.state!.held.water).toBeNull();
          expect(await live.rises(0)).toBeGreaterThan(valve!);
        } else {
          expect(live.state!.held.water).toMatch(/disk/);
          expect(await live.rises(0)).toBe(valve);
        }
        expect(live.state!.link.state).toBe('up');
        await delay(50);
        await live.end('SIGINT');
        expect(await live.outputs()).toBe(0);
      } finally {
        await rig?.stop();
        rig = undefined;
        execFileSync('umount', ['-l', disk]);
      }
    },
  );
});
