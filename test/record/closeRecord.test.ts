import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { closeRecord } from '../../server/session/closeRecord.js';
import { readDescription, writeDescription } from '../../server/session/description.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { recordedSession } from '../analysis/recorded.js';
import { readBack, record, temporaryFolder } from './sessions.js';

const recorded = recordedSession({ minutes: 3 });
afterAll(() => recorded.remove());

/** The session as a crash leaves it: the record cut, nothing noted of its end. */
function crashed(share: number): string {
  const folder = path.join(temporaryFolder(), 'session');
  fs.cpSync(recorded.folder, folder, { recursive: true });
  const file = path.join(folder, 'record.mcap');
  fs.truncateSync(file, Math.floor(fs.statSync(file).size * share));
  const { water: _, ...description } = readDescription(folder);
  writeDescription(folder, { ...description, ended: null });
  return folder;
}

/** Volumes that the board told, by the decisions that are left. */
async function givenUl(folder: string): Promise<number> {
  let nl = 0;
  const reader = await readRecord(folder);
  reader.visit({
    decision: (decision) => {
      if (decision.kind === 'pulse done') nl += decision.volumeNl;
    },
  });
  return nl / 1_000;
}

describe('a session whose program died', { timeout: 120_000 }, () => {
  it('is closed, replayed, and its water derived from what is left, so that the day counts it', async () => {
    for (const share of [0.15, 0.45, 0.999]) {
      const folder = crashed(share);
      const before = await givenUl(folder);
      const told: number[] = [];
      const { finished, replay } = await closeRecord(folder, (done) => told.push(done));
      expect(finished.state.state).toBe('torn');
      expect(replay).toMatchObject({ identical: true });
      const description = readDescription(folder);
      expect(description.ended).toMatchObject({ how: 'mended' });
      expect(description.replay).toEqual(replay);
      expect(description.water!.givenUl).toBeCloseTo(before, 9);
      // At most the drop that was under way and those that waited in the board.
      expect(description.water!.uncertainUl).toBeLessThanOrEqual(8);
      expect(told).toEqual([...told].sort((a, b) => a - b));
      expect(told.at(-1)).toBeGreaterThanOrEqual(0.5);
      expect(await givenUl(folder)).toBeCloseTo(before, 9);
    }
  });

  it('counts a drop as uncertain that was begun and whose end was never told', async () => {
    const { events } = await readBack(recorded.folder);
    const drops = events.flatMap((event) =>
      event.type === 'decision' &&
      event.decision.kind === 'pulse done' &&
      event.decision.volumeNl > 0
        ? [event.decision.input]
        : [],
    );
    const folder = crashed(1);
    fs.rmSync(path.join(folder, 'record.mcap'));
    const end = events.findIndex((event) => event.type === 'input' && event.input === drops[2]);
    record(folder, events.slice(0, end), { close: false });
    const { pid } = spawnSync(process.execPath, ['--version']);
    fs.writeFileSync(path.join(folder, 'recording.lock'), `${pid} 1\n`);
    await closeRecord(folder);
    const { water } = readDescription(folder);
    // The demo gives 4 uL a drop.
    expect(water!.givenUl).toBeCloseTo(8, 1);
    expect(water!.uncertainUl).toBeCloseTo(4, 1);
  });

  it('that did say what it gave keeps its own word', async () => {
    const folder = crashed(0.5);
    const own = { givenUl: 77, uncertainUl: 1 };
    writeDescription(folder, { ...readDescription(folder), water: own });
    await closeRecord(folder);
    expect(readDescription(folder).water).toEqual(own);
  });
});
