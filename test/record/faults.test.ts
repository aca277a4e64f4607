import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Recorder, type RecorderOptions } from '../../server/session/record/recorder.js';
import { diskFiles, type RecordFiles } from '../../server/session/record/recordFile.js';
import type { TroubleKind } from '../../server/session/record/segmentLog.js';
import { blank } from '../../server/wire/codec.js';
import { FailingFiles } from './failingFiles.js';
import { publicRead } from './publicRead.js';
import { type Event, HEADER, readBack, tell, temporaryFolder } from './sessions.js';

/** A live recording in virtual time: 1 kHz samples, a tick every 20 ms. */
class Rig {
  readonly folder = temporaryFolder();
  readonly troubles: TroubleKind[] = [];
  readonly events: Event[] = [];
  readonly recorder: Recorder;
  nowMs = 0;

  constructor(
    readonly files: RecordFiles,
    options: RecorderOptions = {},
  ) {
    this.recorder = Recorder.create(this.folder, HEADER, {
      files,
      nowMs: () => this.nowMs,
      onTrouble: (kind) => this.troubles.push(kind),
      ...options,
    });
  }

  run(ms: number): void {
    for (let i = 0; i < ms; i++) {
      this.nowMs++;
      const input = this.events.length;
      const sample = { ...blank('sample'), boardUs: this.nowMs * 1000, count: this.nowMs * 2 };
      const event: Event = { type: 'sample', input, sample };
      this.events.push(event);
      tell(this.recorder, event);
      this.recorder.batchEnd(false);
      if (this.nowMs % 20 === 0) this.recorder.tick();
    }
  }
}

describe('a live recording', () => {
  it('writes what a batch that commanded caused before the batch ends', () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    const before = rig.recorder.bytes;
    rig.recorder.sample(0, blank('sample'));
    rig.recorder.batchEnd(false);
    expect(rig.recorder.bytes).toBe(before);
    rig.recorder.sample(1, blank('sample'));
    rig.recorder.command(1, 'pulse', blank('pulse'));
    rig.recorder.batchEnd(true);
    expect(rig.recorder.bytes).toBeGreaterThan(before);
    rig.recorder.close('done');
  });

  it('holds nothing back for longer than 20 ms, by its batches or by its tick', async () => {
    const rig = new Rig(new FailingFiles());
    for (let i = 0; i < 50; i++) {
      rig.run(7);
      const { state } = await readBack(rig.folder);
      expect(rig.events.length - 1 - state.lastInput).toBeLessThanOrEqual(20);
    }
    rig.nowMs += 20;
    rig.recorder.tick();
    expect((await readBack(rig.folder)).events).toEqual(rig.events);
    rig.recorder.close('done');
  });

  it('syncs each second and never waits for it, however long a sync takes', () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    rig.run(1010);
    expect(files.syncs).toBe(1);
    const written = rig.recorder.bytes;
    // The sync has not ended, and does not for 3 s: writing goes on, no other is begun.
    rig.run(3000);
    expect(files.syncs).toBe(1);
    expect(rig.recorder.bytes).toBeGreaterThan(written + 9000);
    expect(rig.recorder.state).toBe('writing');
    files.finishSyncs();
    rig.run(1010);
    expect(files.syncs).toBe(2);
    expect(rig.troubles).toEqual([]);
    rig.recorder.close('done');
  });

  it('takes short writes as they come', async () => {
    const files = new FailingFiles();
    files.mostBytes = 13;
    const rig = new Rig(files);
    rig.run(200);
    expect(rig.recorder.close('done')).toBe(true);
    const { events, state } = await readBack(rig.folder);
    expect(events).toEqual(rig.events);
    expect(state.state).toBe('whole');
    expect(rig.recorder.bytes).toBe(fs.statSync(path.join(rig.folder, 'record.mcap')).size);
  });
});

describe('a failed sync', () => {
  it('begins a new file that holds again all that was not known to be on the disk', async () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    rig.run(1500);
    files.finishSyncs();
    rig.run(700);
    files.fail('sync', 'EIO');
    files.finishSyncs();
    expect(rig.troubles).toEqual(['sync']);
    expect(rig.recorder.state).toBe('writing');
    files.heal();
    rig.run(1500);
    files.finishSyncs();
    expect(rig.recorder.close('done')).toBe(true);
    expect(files.created).toBe(2);
    const { events, state } = await readBack(rig.folder);
    expect(events).toEqual(rig.events);
    expect(state).toMatchObject({ state: 'whole', troubles: [] });
    // Should the kernel have dropped what the sync was for, the new file alone has it.
    const first = path.join(rig.folder, 'record.mcap');
    const kept = fs.readFileSync(first);
    let lost = kept.length;
    for (let cut = kept.length; cut > 0; cut -= 500) {
      fs.writeFileSync(first, kept.subarray(0, cut));
      if ((await readBack(rig.folder)).state.state !== 'whole') break;
      lost = cut;
    }
    // More than the second before the failure, of about 160 bytes each 20 ms.
    expect(kept.length - lost).toBeGreaterThan(50 * 100);
  });

  it('that comes again and again makes a few files, not one a second', () => {
    const files = new FailingFiles();
    files.fail('sync', 'EIO');
    const rig = new Rig(files);
    for (let i = 0; i < 120; i++) {
      rig.run(500);
      files.finishSyncs();
    }
    expect(files.created).toBeGreaterThan(3);
    expect(files.created).toBeLessThan(10);
    expect(rig.recorder.state).toBe('writing');
    rig.recorder.close('done');
  });
});

describe('a disk that takes nothing', () => {
  it.each(['ENOSPC', 'EIO', 'EDQUOT'])(
    '%s is reported once, and nothing is lost once it recovers',
    async (code) => {
      const files = new FailingFiles();
      const rig = new Rig(files);
      rig.run(500);
      files.fail('write', code);
      files.partBytes = 60;
      const before = files.writes;
      rig.run(5000);
      expect(rig.troubles).toEqual([code === 'EIO' ? 'io' : 'full']);
      expect(rig.recorder.state).toBe('failed');
      expect(rig.recorder.reason).toContain(code);
      // It is tried again each second, not each batch.
      expect(files.writes - before).toBeLessThan(20);
      files.heal();
      rig.run(1500);
      expect(rig.troubles.at(-1)).toBe('recovered');
      expect(rig.recorder.state).toBe('writing');
      expect(rig.recorder.close('done')).toBe(true);
      const { events, state } = await readBack(rig.folder);
      expect(events).toEqual(rig.events);
      expect(state.state).toBe('whole');
      // A full disk leaves one whole file, with no half chunk in the middle of it.
      if (code !== 'EIO') expect(publicRead(path.join(rig.folder, 'record.mcap')).done).toBe(true);
    },
  );

  it('not even a truncation: the next file has everything, and the half chunk is reported as none', async () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    rig.run(500);
    files.fail('write', 'ENOSPC');
    files.fail('truncate', 'EIO');
    files.partBytes = 60;
    rig.run(100);
    files.heal();
    rig.run(2000);
    rig.recorder.close('done');
    const { events, state } = await readBack(rig.folder);
    expect(events).toEqual(rig.events);
    expect(state.state).toBe('whole');
  });

  it('to the end: what was written before stays readable, and the end says so', async () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    rig.run(500);
    files.fail('write', 'ENOSPC');
    rig.run(500);
    expect(rig.recorder.close('done')).toBe(false);
    const { events, state } = await readBack(rig.folder);
    expect(events).toEqual(rig.events.slice(0, events.length));
    expect(events.length).toBeGreaterThanOrEqual(480);
    expect(state.state).toBe('open');
  });

  it('for so long that memory would fill: says what is lost, keeps what came before, records again', async () => {
    const files = new FailingFiles();
    const rig = new Rig(files);
    rig.run(100);
    files.fail('write', 'ENOSPC');
    const note = (text: string): Event => ({
      type: 'input',
      input: rig.events.length,
      what: { kind: 'operator', act: { act: 'note', text }, by: { who: '', from: '' } },
    });
    for (let i = 0; i < 20; i++) {
      rig.events.push(note('x'.repeat(1 << 20)));
      tell(rig.recorder, rig.events.at(-1)!);
    }
    rig.run(1100);
    const kept = rig.events.length;
    expect(rig.troubles).toEqual(['full', 'lost']);
    files.heal();
    rig.run(2000);
    expect(rig.troubles).toEqual(['full', 'lost', 'recovered']);
    rig.recorder.close('done');
    const { events, state } = await readBack(rig.folder);
    const missing = rig.events.length - events.length;
    expect(missing).toBeGreaterThan(3);
    const same = events.findIndex((event, i) => event.type !== rig.events[i]!.type);
    expect(events.slice(0, same)).toEqual(rig.events.slice(0, same));
    expect(events.slice(same)).toEqual(rig.events.slice(same + missing));
    expect(same + missing).toBeGreaterThanOrEqual(kept);
    expect(state.state).toBe('damaged');
    expect(state.troubles).toEqual([
      expect.objectContaining({ kind: 'missing', lastInput: same - 1, nextInput: same + missing }),
    ]);
  });

  it('at the very start: the recorder is not made, and leaves no file or lock behind', () => {
    for (const [what, code] of [
      ['create', 'EACCES'],
      ['write', 'ENOSPC'],
    ] as const) {
      const files = new FailingFiles();
      files.fail(what, code);
      const folder = temporaryFolder();
      expect(() => Recorder.create(folder, HEADER, { files })).toThrow(
        expect.objectContaining({ code: 'RECORD_UNWRITABLE' }),
      );
      expect(fs.readdirSync(folder)).toEqual([]);
    }
  });

  it('never throws into the loop, whatever fails and heals when, and loses nothing it could hold', async () => {
    const act = fc.oneof(
      fc.nat(1500).map((ms) => ({ run: ms })),
      fc.record({
        fail: fc.constantFrom('write', 'truncate', 'sync', 'create'),
        code: fc.constantFrom('ENOSPC', 'EIO'),
        part: fc.nat(200),
      }),
      fc.constant({ heal: true }),
      fc.constant({ synced: true }),
    );
    await fc.assert(
      fc.asyncProperty(fc.array(act, { maxLength: 25 }), async (acts) => {
        const files = new FailingFiles();
        const rig = new Rig(files);
        for (const one of acts) {
          if ('run' in one) rig.run(one.run);
          else if ('heal' in one) files.heal();
          else if ('synced' in one) files.finishSyncs();
          else {
            files.fail(one.fail as 'write', one.code);
            files.partBytes = one.part;
          }
        }
        files.heal();
        files.finishSyncs();
        rig.run(1100);
        expect(rig.recorder.close('done')).toBe(true);
        const { events, state } = await readBack(rig.folder);
        expect(events).toEqual(rig.events);
        expect(state.state).toBe('whole');
      }),
      { seed: 12, numRuns: 40 },
    );
  });
});

describe.runIf(process.platform === 'linux')('a disk that is really full', () => {
  it('/dev/full: every write fails, and the loop only hears of it', () => {
    let full = false;
    const rig = new Rig({
      create: (file) => {
        const real = diskFiles.create(file);
        const fd = fs.openSync('/dev/full', 'w');
        return {
          ...real,
          write: (bytes, from, length) =>
            full ? fs.writeSync(fd, bytes, from, length) : real.write(bytes, from, length),
          close: () => {
            fs.closeSync(fd);
            real.close();
          },
        };
      },
      remove: diskFiles.remove,
    });
    rig.run(100);
    full = true;
    rig.run(300);
    expect(rig.troubles).toEqual(['full']);
    full = false;
    rig.run(1500);
    expect(rig.troubles).toEqual(['full', 'recovered']);
    rig.recorder.close('done');
  });

  it.runIf(process.getuid?.() === 0)('a small file system filled to the last block', async () => {
    const mount = temporaryFolder();
    execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=256k', 'tmpfs', mount]);
    try {
      const troubles: TroubleKind[] = [];
      let nowMs = 0;
      const recorder = Recorder.create(mount, HEADER, {
        nowMs: () => nowMs,
        onTrouble: (kind) => troubles.push(kind),
      });
      const ballast = path.join(mount, 'ballast');
      fs.writeFileSync(ballast, new Uint8Array(100_000));
      const sample = blank('sample');
      let input = 0;
      const run = (ms: number) => {
        for (const end = nowMs + ms; nowMs < end; nowMs++) {
          sample.boardUs += 1000;
          sample.count += 100 * (nowMs % 3);
          recorder.sample(input++, sample);
          recorder.batchEnd(nowMs % 5 === 0);
        }
      };
      run(6000);
      expect(troubles).toEqual(['full']);
      fs.rmSync(ballast);
      run(1500);
      expect(troubles).toEqual(['full', 'recovered']);
      expect(recorder.close('done')).toBe(true);
      const { state } = await readBack(mount);
      expect(state).toMatchObject({ state: 'whole', lastInput: input - 1 });
    } finally {
      execFileSync('umount', ['--lazy', mount]);
    }
  });
});
