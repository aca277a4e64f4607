import { spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { blank } from '../../server/wire/codec.js';
import { OUTCOME } from '../../server/wire/messages.js';
import { PtyRig, RIG_SCRIPT } from '../tools/ptyRig.js';
import { type HeardFrame, RawHost } from './rawHost.js';

const TAG = 0x31;
let rig: PtyRig | undefined;
let host: RawHost | undefined;
let folder: string;

beforeEach(() => {
  folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-rig-'));
});
afterEach(async () => {
  host?.close();
  await rig?.stop();
  rig = undefined;
  host = undefined;
  fs.rmSync(folder, { recursive: true, force: true });
});

async function connected(options: string[], port?: string): Promise<RawHost> {
  rig = await PtyRig.start(options);
  host = new RawHost(port ?? rig.port);
  return host;
}

/** Beats and asks for a pulse at every sample until one fires: a busy machine may miss some. */
async function fireOnce(on: RawHost): Promise<void> {
  const limits = { longestOnUs: 1e6, leastGapUs: 0, allowanceUs: 1e8, leastCounts: 0 };
  let id = 100;
  await on.until(({ name, message, tag }) => {
    if (name === 'outcome' && message.kind === OUTCOME.fired) return true;
    if (name !== 'sample') return false;
    if (tag === TAG) {
      const now = message.boardUs as number;
      on.send('beat', { finishedUs: now, wanted: 0 }, TAG);
      on.send('configure', { ...limits, output: 0, flags: 0, allowanceRises: 100 }, TAG);
      const shape = { ...blank('pulse'), widthUs: 1000, repeats: 1 };
      on.send('pulse', { ...shape, id: id++, expiryUs: now + 9_000_000 }, TAG);
    } else {
      on.send('identify', { nonce: 1, protocol: 1, newTag: TAG }, TAG);
    }
    return false;
  }, 'a pulse to fire');
}

describe('the simulated rig as a process', () => {
  test('is a board on a pseudo-terminal: it shakes hands and fires', async () => {
    const on = await connected(['--seed', '3', '--board-id', '42']);
    expect(rig!.port).toMatch(/^\/dev\//);
    expect(await on.handshake(TAG)).toMatchObject({ boardId: 42, model: 'simulated' });
    await fireOnce(on);
    expect(on.bad).toBe(0);
  });

  test('is the same over TCP', async () => {
    const on = await connected(['--tcp', '0']);
    expect(rig!.port).toMatch(/^tcp:\/\/127\.0\.0\.1:\d+$/);
    await on.handshake(TAG);
    await fireOnce(on);
  });

  test('comes back under another device when it is unplugged and plugged in', async () => {
    const link = path.join(folder, 'board');
    const on = await connected(['--link', link]);
    expect(rig!.port).toBe(link);
    const before = fs.readlinkSync(link);
    const { bootId } = await on.handshake(TAG);
    await rig!.unplug();
    await on.untilClosed();
    expect(fs.existsSync(link)).toBe(false);
    await rig!.replug();
    expect(fs.readlinkSync(link)).not.toBe(before);
    host = new RawHost(link);
    // It has kept its power: the same boot, and it remembers that there was a connection.
    const again = await host.handshake(TAG + 1);
    expect(again.bootId).toBe(bootId);
    expect([TAG, TAG + 1]).toContain(again.previousTag);
  });

  test('comes back over TCP on the same address', async () => {
    const on = await connected(['--tcp', '0']);
    await on.handshake(TAG);
    const { port } = rig!;
    await rig!.unplug();
    await on.untilClosed();
    await rig!.replug();
    expect(rig!.port).toBe(port);
    host = new RawHost(port);
    await host.handshake(TAG + 1);
  });

  test('is another boot after a reset, and says so first', async () => {
    const on = await connected([]);
    const { bootId } = await on.handshake(TAG);
    const spoke = ({ name, message }: HeardFrame) => name === 'identity' && message.nonce === 0;
    let first: HeardFrame | undefined;
    // Said once; on a machine that is held up the line may be full just then.
    for (let tries = 0; tries < 4 && first === undefined; tries++) {
      on.heard.length = 0;
      await rig!.reset();
      first = await on.until(spoke, 'the board to speak first', 4_000).catch(() => undefined);
    }
    expect(first).toMatchObject({ tag: 0 });
    expect(first!.message).toMatchObject({ resetCause: 2 });
    expect(first!.message.bootId).not.toBe(bootId);
  });

  test('lets time go after a stall instead of catching up', async () => {
    await connected([]);
    const fromMs = performance.now();
    const before = (await rig!.state()).boardUs as number;
    await rig!.say('stall 1000');
    await host!.until(
      ({ message, name }) => name === 'sample' && (message.boardUs as number) > before + 200_000,
      'samples after the stall',
    );
    const after = (await rig!.state()).boardUs as number;
    const passedMs = performance.now() - fromMs;
    expect(passedMs).toBeGreaterThan(900);
    expect((after - before) / 1000).toBeLessThan(passedMs - 1000 + 150);
  });

  test('flips bits on the line when told to, and the board counts what it cannot read', async () => {
    const on = await connected([]);
    await on.handshake(TAG);
    await rig!.say('noise 0.02');
    for (let n = 0; n < 50; n++) on.send('quiet', { outputs: 0 }, TAG);
    await on.until(({ name, message }) => {
      return name === 'sample' && (message.badFrames as number) > 5;
    }, 'bad frames');
    expect(on.bad).toBeGreaterThan(0);
    await rig!.say('noise 0');
    await on.handshake(TAG + 1);
  });

  test('moves the belt as told', async () => {
    await connected(['--start-cm', '0', '--counts-per-cm', '10', '--slip-mm', '0']);
    await rig!.say('speed 50');
    await host!.until(
      ({ name, message }) => name === 'sample' && (message.count as number) >= 100,
      'the count',
    );
    await rig!.say('speed 0');
    const { travelCm, speedCmPerS } = await rig!.state();
    expect(speedCmPerS).toBe(0);
    expect(travelCm as number).toBeGreaterThan(9.8);
    await expect(rig!.say('speed fast')).rejects.toThrow('Not a command');
  });

  test('ends when its parent closes its input, and takes its link with it', async () => {
    const link = path.join(folder, 'board');
    rig = await PtyRig.start(['--link', link]);
    expect(await rig.orphan()).toBe(0);
    expect(fs.existsSync(link)).toBe(false);
  });

  test('ends when its parent is killed', async () => {
    // A shell in between is the parent; its death is all that the rig gets to see.
    const rigLine = `"${process.execPath}" "${RIG_SCRIPT}"`;
    const parent = spawn('sh', ['-c', `${rigLine} --tcp 0 < /dev/null & echo $!; wait`]);
    let text = '';
    await new Promise<void>((resolve) => {
      parent.stdout.on('data', (chunk) => {
        text += chunk;
        if (text.includes('port')) resolve();
      });
    });
    const pid = Number(text.split('\n')[0]);
    const running = () => {
      try {
        return process.kill(pid, 0);
      } catch {
        return false;
      }
    };
    expect(running()).toBe(true);
    parent.kill('SIGKILL');
    while (running()) await new Promise((resolve) => setTimeout(resolve, 50));
  });

  test('says what is wrong with its command line', async () => {
    await expect(PtyRig.start(['--belt-cm', 'long'])).rejects.toThrow('no port');
  });
});
