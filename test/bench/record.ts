/** What recording costs and what a record holds: an hour of session at 1 kHz, on this machine, now. */
import { mkdtempSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setFlagsFromString } from 'node:v8';
import { runInNewContext } from 'node:vm';
import { finishRecord } from '../../server/session/record/finishRecord.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { blank } from '../../server/wire/codec.js';

export interface RecordBench {
  /** As a rehearsal records: large chunks, no sync. */
  readonly bulkNsPerSample: number;
  /** As a live session records: a write every 20 ms; the share of a core at 1 kHz follows. */
  readonly liveNsPerSample: number;
  readonly liveShareOfCore: number;
  readonly liveHeapBytesPerSample: number;
  readonly liveMBPerHour: number;
  readonly finishedMBPerHour: number;
  readonly finishS: number;
  readonly decodedLiveSamplesPerS: number;
  readonly decodedFinishedSamplesPerS: number;
}

const HOUR = 3_600_000;

/** Processor time of this process: what else the machine does then counts for less. */
function cpuUs(): number {
  const { user, system } = process.cpuUsage();
  return user + system;
}

/**
 * Hands a recorder `samples` milliseconds of session: a belt with jitter, a heartbeat each 25 ms, an
 * edge about 6 times a second, a decision about once. `nextMs` moves the recorder's clock.
 */
function drive(recorder: Recorder, samples: number, nextMs: () => void): void {
  const sample = blank('sample');
  const edge = blank('edge');
  const beat = blank('beat');
  let input = 0;
  let noise = 1;
  for (let i = 0; i < samples; i++) {
    noise = (Math.imul(noise, 1664525) + 1013904223) >>> 0;
    sample.boardUs = (sample.boardUs + 990 + (noise >>> 27)) >>> 0;
    sample.count = (sample.count + (i % 4000 < 2500 ? 10 + (noise >>> 29) : 0)) | 0;
    sample.inputs = i % 320 < 40 ? 1 : 0;
    recorder.sample(input, sample);
    if (i % 25 === 0) {
      beat.finishedUs = sample.boardUs;
      beat.wanted = 3;
      recorder.command(input, 'beat', beat);
    }
    if (i % 160 === 0) {
      edge.boardUs = sample.boardUs;
      edge.count = sample.count;
      edge.level ^= 1;
      recorder.input(++input, { kind: 'edge', message: edge });
    }
    if (i % 1000 === 0)
      recorder.decision({
        kind: 'lick',
        artefact: false,
        input,
        boardUs: sample.boardUs,
        lap: 1,
        positionCm: 10.5,
        speedCmPerS: 12,
      });
    input++;
    nextMs();
    recorder.batchEnd(false);
  }
  recorder.close('the bench is done');
}

function record(mode: 'live' | 'bulk', samples: number): { folder: string; ns: number } {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-bench-'));
  const header = { session: 'bench', startedAtMs: Date.now(), software: 'bench', seed: '' };
  let nowMs = 0;
  const recorder = Recorder.create(folder, header, { mode, nowMs: () => nowMs });
  const start = cpuUs();
  drive(recorder, samples, () => {
    nowMs++;
  });
  return { folder, ns: ((cpuUs() - start) * 1000) / samples };
}

async function decode(folder: string): Promise<number> {
  const reader = await readRecord(folder);
  let samples = 0;
  let sum = 0;
  const start = cpuUs();
  reader.visit({
    sample(_input, sample) {
      samples++;
      sum = (sum + sample.count) | 0;
    },
    input() {},
    command() {},
    decision() {},
  });
  const seconds = (cpuUs() - start) / 1e6;
  if (Number.isNaN(sum)) throw new Error('unreachable: keeps the sum from being left out');
  return samples / seconds;
}

/** Heap bytes a live recording allocates per sample, over 20 s of session; collects before. */
function garbage(): number {
  setFlagsFromString('--expose-gc');
  const collect = runInNewContext('gc') as () => void;
  const samples = 20_000;
  collect();
  const before = process.memoryUsage().heapUsed;
  const { folder } = record('live', samples);
  const used = process.memoryUsage().heapUsed - before;
  rmSync(folder, { recursive: true });
  return used / samples;
}

/** Records, finishes and reads an hour of session, live and in bulk; takes some ten seconds. */
export async function benchRecord(): Promise<RecordBench> {
  const folders: string[] = [];
  const hour = (mode: 'live' | 'bulk') => {
    const made = record(mode, HOUR);
    folders.push(made.folder);
    return made;
  };
  try {
    record('bulk', 100_000);
    const bulk = hour('bulk');
    const live = hour('live');
    const size = () => statSync(join(live.folder, 'record.mcap')).size / 1e6;
    const liveMBPerHour = size();
    await decode(live.folder);
    const decodedLiveSamplesPerS = await decode(live.folder);
    const start = cpuUs();
    await finishRecord(live.folder);
    const finishS = (cpuUs() - start) / 1e6;
    await decode(live.folder);
    return {
      bulkNsPerSample: bulk.ns,
      liveNsPerSample: live.ns,
      liveShareOfCore: (live.ns * 1000) / 1e9,
      liveHeapBytesPerSample: garbage(),
      liveMBPerHour,
      finishedMBPerHour: size(),
      finishS,
      decodedLiveSamplesPerS,
      decodedFinishedSamplesPerS: await decode(live.folder),
    };
  } finally {
    for (const folder of folders) rmSync(folder, { recursive: true, force: true });
  }
}
