import { spawn } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { readDescription, rfc3339, writeDescription } from '../../server/session/description.js';
import { finish } from '../../server/session/record/finish.js';
import { mend } from '../../server/session/record/mend.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { recordingProcess } from '../../server/session/record/recordLock.js';
import { asStored, HEADER, readBack, record, session, temporaryFolder } from './sessions.js';

const [events] = fc
  .sample(session(1500), { seed: 51, numRuns: 20 })
  .sort((a, b) => b.length - a.length);
const stored = asStored(events!);
/** What runs in a process of its own is what `npm run build` made. */
const script = (name: string) => path.join(packageRoot, 'dist', name);
const FINISH = 'server/session/record/finishProcess.js';

/** Starts a recording process and kills it once it has said `lines` lines; the last input it said. */
async function killed(folder: string, lines: number): Promise<number> {
  const child = spawn(process.execPath, [script('test/tools/recordUntilKilled.js'), folder], {
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  let said = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => {
    said += text;
    if (said.split('\n').length > lines) child.kill('SIGKILL');
  });
  await new Promise((resolve) => child.on('close', resolve));
  return Number(said.slice(0, said.lastIndexOf('\n')).split('\n').at(-1));
}

function describeSession(folder: string): void {
  writeDescription(folder, {
    format: 1,
    name: path.basename(folder),
    subject: 'm31',
    experimenter: null,
    protocolNumber: null,
    sessionNumber: null,
    title: 'Test',
    startedAt: rfc3339(new Date(HEADER.startedAtMs)),
    software: { name: 'lapwing', version: '0.1.0' },
    board: null,
    seed: 'seed',
    calibrations: [],
    files: [],
    ended: null,
  });
}

// Processes start slowly on a loaded machine.
const PATIENT = { timeout: 120_000 };

describe('a recording process that is killed', PATIENT, () => {
  it.each([1, 40, 300])('after %i batches has lost nothing that it had written', async (lines) => {
    const folder = temporaryFolder();
    const last = await killed(folder, lines);
    const { events: told, state } = await readBack(folder);
    expect(state.lastInput).toBeGreaterThanOrEqual(last);
    expect(told.filter((event) => event.type === 'sample').length).toBe(state.lastInput + 1);
    expect(['open', 'torn']).toContain(state.state);
  });

  it('leaves a session that can be mended: closed, described, and said to have been mended', async () => {
    const folder = temporaryFolder();
    describeSession(folder);
    const last = await killed(folder, 50);
    const { state } = await mend(folder);
    expect(state.lastInput).toBeGreaterThanOrEqual(last);
    const reader = await readRecord(folder);
    expect(reader.visit({})).toMatchObject({ finished: true, found: 0 });
    const description = readDescription(folder);
    expect(description.ended).toMatchObject({ how: 'mended' });
    expect(Date.parse(description.ended!.at)).toBe(Math.floor(reader.timeUs / 1000));
    expect(description.record).toMatchObject({ lastInput: state.lastInput, state: state.state });
    expect(description.record!.missing[0]).toMatch(/never closed|middle of a chunk/);
    expect(fs.existsSync(path.join(folder, 'recording.lock'))).toBe(false);
    // Mending what is mended changes nothing but says the same.
    await mend(folder);
    expect(readDescription(folder)).toEqual(description);
  });

  it('is noticed: its lock holds nobody up, while that of a living one does', async () => {
    const folder = temporaryFolder();
    await killed(folder, 5);
    expect(fs.existsSync(path.join(folder, 'recording.lock'))).toBe(true);
    expect(recordingProcess(folder)).toBeUndefined();
    const live = temporaryFolder();
    const recorder = Recorder.create(live, HEADER);
    expect(recordingProcess(live)).toBe(process.pid);
    const busy = expect.objectContaining({ code: 'RECORD_BUSY' });
    await expect(mend(live)).rejects.toThrow(busy);
    await expect(finish(live, script(FINISH))).rejects.toThrow(busy);
    // Reading is always allowed.
    expect((await readBack(live)).state.state).toBe('open');
    recorder.close('done');
    expect(recordingProcess(live)).toBeUndefined();
  });
});

describe('finishing in a process of its own', PATIENT, () => {
  it('gives the same record, compressed, and notes in session.json what it is', async () => {
    const folder = temporaryFolder();
    describeSession(folder);
    record(folder, events!);
    const ended = { how: 'rules', at: rfc3339(new Date()), reason: 'time' } as const;
    writeDescription(folder, { ...readDescription(folder), ended });
    const finished = await finish(folder, script(FINISH));
    expect(finished.state).toMatchObject({ state: 'whole', finished: true });
    expect((await readBack(folder)).events).toEqual(stored);
    const description = readDescription(folder);
    expect(description.ended).toEqual(ended);
    expect(description.record).toEqual({
      state: 'whole',
      messages: finished.state.messages,
      lastInput: finished.state.lastInput,
      bytes: fs.statSync(path.join(folder, 'record.mcap')).size,
      missing: [],
    });
  });

  it('killed at any moment leaves a record that reads the same, and can be finished', async () => {
    for (const wait of [60, 140, 220]) {
      const folder = temporaryFolder();
      record(folder, events!);
      const child = spawn(process.execPath, [script(FINISH), folder], { stdio: 'ignore' });
      const closed = new Promise((resolve) => child.on('close', resolve));
      await new Promise((resolve) => setTimeout(resolve, wait));
      child.kill('SIGKILL');
      await closed;
      expect((await readBack(folder)).events).toEqual(stored);
      await finish(folder, script(FINISH));
      expect((await readBack(folder)).events).toEqual(stored);
      expect(fs.readdirSync(folder)).toEqual(['record.mcap']);
    }
  });

  it('that fails gives the code, and one that cannot even start says so', async () => {
    const empty = temporaryFolder();
    await expect(finish(empty, script(FINISH))).rejects.toThrow(
      expect.objectContaining({ code: 'RECORD_MISSING' }),
    );
    await expect(finish(empty, script('none.js'))).rejects.toThrow(
      expect.objectContaining({ code: 'RECORD_UNFINISHED' }),
    );
  });
});
