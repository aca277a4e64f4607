import { readFileSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { LoopBench } from '../../server/calibrate/loopBench.js';
import { LocalClient, quietOnce } from '../../server/loop/localClient.js';
import type { BenchItem } from '../../server/loop/protocol.js';
import { finished, lapwing, until } from '../tools/liveRig.js';
import { ServedRig } from '../tools/servedRig.js';

let rig: ServedRig;
beforeAll(async () => {
  rig = await ServedRig.start();
}, 120_000);
afterAll(() => rig?.stop());

/** One that was not held up by a loaded machine. */
async function attempt(bench: LoopBench, output: string, ms: number, into: 'vial' | 'spout') {
  for (let tries = 1; ; tries++) {
    try {
      return await bench.attempt({ output, widthUs: ms * 1_000, into });
    } catch (error) {
      if ((error as { code?: string }).code !== 'BENCH_LATE' || tries === 10) throw error;
    }
  }
}

describe('the bench of a real loop, between sessions', { timeout: 120_000 }, () => {
  it('shows edges as they come, and drives an output for as long as was asked', async () => {
    const bench = await LoopBench.open(rig.address);
    const items: BenchItem[] = [];
    bench.listen((item) => items.push(item));
    const before = await rig.rises();
    const tried = await attempt(bench, 'marker', 20, 'spout');
    expect(tried).toMatchObject({ output: 'marker', onUs: 20_000, volumeNl: 0 });
    expect((await rig.rises())[4]! - before[4]!).toBe(1);
    // The loopback wire of the demo's rig leads to input 4.
    await until('the echo', () => items.some((item) => item.is === 'edge' && item.line === 4));
    const echo = items.find((item) => item.is === 'edge' && item.line === 4)!;
    expect(echo).toMatchObject({ level: 1, atUs: tried.riseUs! + 3 });
    bench.close();
  });

  it('holds to the limits of the rig file, and says which', async () => {
    const bench = await LoopBench.open(rig.address);
    const before = await rig.rises();
    await expect(attempt(bench, 'laser', 900, 'spout')).rejects.toMatchObject({
      code: 'BENCH_WITHHELD',
      message: expect.stringContaining('500 ms is its longest'),
    });
    await expect(attempt(bench, 'lazer', 9, 'spout')).rejects.toThrow('there is valve, laser');
    await expect(attempt(bench, 'laser', 0.0001, 'spout')).rejects.toThrow('whole microseconds');
    // Ten pulses of the tone would pass its duty or gap: at once after the first it is refused.
    await attempt(bench, 'tone', 20, 'spout');
    await expect(attempt(bench, 'tone', 20, 'spout')).rejects.toThrow('1 s is its least gap');
    const after = await rig.rises();
    expect(after.map((rises, n) => rises - before[n]!).slice(0, 5)).toEqual([0, 0, 0, 1, 0]);
    bench.close();
  });

  it('lets water into a vial beyond what an animal may have, and never into the spout', async () => {
    const path = rig.rigPath;
    const text = readFileSync(path, 'utf8');
    writeFileSync(path, text.replace('per_session: 1 mL', 'per_session: 5 uL'));
    const bench = await LoopBench.open(rig.address);
    await bench.reload();
    await rig.hands.say('vial on');
    for (let n = 0; n < 3; n++) {
      await attempt(bench, 'valve', 56, 'vial');
      await new Promise((resolve) => setTimeout(resolve, 130));
    }
    expect(Number((await rig.hands.say('weigh')).mg)).toBeGreaterThan(8);
    await attempt(bench, 'valve', 56, 'spout');
    await new Promise((resolve) => setTimeout(resolve, 130));
    await expect(attempt(bench, 'valve', 56, 'spout')).rejects.toMatchObject({
      code: 'BENCH_WITHHELD',
    });
    await rig.hands.say('vial off');
    writeFileSync(path, text);
    await bench.reload();
    bench.close();
  });

  it('ends what goes on when everything is stopped, and when whoever tried it goes away', async () => {
    const bench = await LoopBench.open(rig.address);
    const tone = bench.attempt({ output: 'tone', widthUs: 1_000_000, into: 'spout' });
    const ended = tone.catch((error: unknown) => error);
    await new Promise((resolve) => setTimeout(resolve, 100));
    await quietOnce(rig.address);
    expect(await ended).toMatchObject({ code: 'BENCH_STOPPED' });
    await until('an idle output', () => bench.state?.outputs === 0);
    await new Promise((resolve) => setTimeout(resolve, 1_100));
    const again = bench.attempt({ output: 'tone', widthUs: 1_000_000, into: 'spout' });
    again.catch(() => {});
    await new Promise((resolve) => setTimeout(resolve, 100));
    bench.close();
    const watcher = await LoopBench.open(rig.address);
    await until('an idle output', () => watcher.state?.outputs === 0);
    watcher.close();
  });

  it('tries nothing while a session runs, and goes on showing', async () => {
    const bench = await LoopBench.open(rig.address);
    const client = new LocalClient({ ...rig.address, client: 'a test', reconnect: false });
    client.start();
    await client.ready();
    await client.begin({ rules: 'rules.yaml', subject: 'm1' });
    await expect(attempt(bench, 'marker', 5, 'spout')).rejects.toMatchObject({
      code: 'BENCH_IN_SESSION',
    });
    await expect(bench.reload()).rejects.toMatchObject({ code: 'LOOP_BUSY' });
    let seen = 0;
    bench.listen(() => seen++);
    await until('an edge or an output', () => seen > 0, 60_000);
    await client.end('enough');
    client.close();
    await until('the end', () => bench.state?.session !== 'running');
    expect((await attempt(bench, 'marker', 5, 'spout')).onUs).toBe(5_000);
    bench.close();
  });

  it('reads no rig file that describes another rig', async () => {
    const text = readFileSync(rig.rigPath, 'utf8');
    const bench = await LoopBench.open(rig.address);
    writeFileSync(rig.rigPath, text.replace(/rig: served.*/, 'rig: another'));
    await expect(bench.reload()).rejects.toMatchObject({ code: 'BENCH_OTHER_RIG' });
    writeFileSync(rig.rigPath, text);
    bench.close();
  });

  it('is what `lapwing calibrate` uses while the service runs: the result is kept, listed, in force', async () => {
    const answers = ['--yes', '--answer', 'laps=3', 'lengthCm=60', 'offset=keep it'];
    const made = await finished(
      lapwing('calibrate', 'belt', '--rig', rig.rigPath, ...answers, '--use', '--json'),
    );
    expect(made.err).toBe('');
    expect(made.status).toBe(0);
    const { calibration } = JSON.parse(made.out) as {
      calibration: { name: string; values: { countsPerCm: number; direction: string } };
    };
    expect(calibration.values.direction).toBe('forward');
    expect(calibration.values.countsPerCm).toBeCloseTo(25, 0);
    expect(readFileSync(rig.rigPath, 'utf8')).toContain(`calibration: ${calibration.name}`);
    const listed = await finished(lapwing('calibrate', 'list', '--rig', rig.rigPath));
    expect(listed.out).toContain(`${calibration.name}  belt of belt, 0 days old, in force`);
  });

  it('answers nothing in advance that does not fit, and says what would', async () => {
    const { status, err } = await finished(
      lapwing('calibrate', 'belt', '--rig', rig.rigPath, '--yes', '--answer', 'laps=many'),
    );
    expect(status).toBe(1);
    expect(err).toContain('CALIBRATE_ANSWER');
    expect(err).toContain('expected 3 to 100');
  });
});
