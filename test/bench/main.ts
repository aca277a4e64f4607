/**
 * `npm run bench [-- PART ...]`: what Lapwing costs, beside what it is compared with, in one run.
 * Machines differ and drift: read ratios and differences, and the figures for this machine alone.
 */
import { arch, cpus, loadavg, release } from 'node:os';
import { CYCLES_PER_US } from '../../hardware-sim/emulator/chip.js';
import { benchEngine } from './engine.js';
import { benchFirmware, type WidthErrors } from './firmware.js';
import { benchMemory } from './memory.js';
import { benchRecord } from './record.js';
import { benchRehearsal } from './rehearsal.js';
import { benchRoundTrip, roundTripTable } from './roundTrip/benchRoundTrip.js';
import { wholeLoop } from './roundTrip/wholeLoop.js';
import { benchRuns } from './runs.js';
import { median } from './statistics.js';
import { benchViewers } from './viewers.js';
import { benchWire } from './wire.js';

/** A bar of the design, and whether this run met it. */
function bar(name: string, figure: string, met: boolean): void {
  console.log(`${met ? 'met   ' : 'MISSED'}  ${name}: ${figure}`);
}

async function roundTrip(): Promise<void> {
  const results = await benchRoundTrip({ contestants: [wholeLoop(0), wholeLoop(20)] });
  console.log(roundTripTable(results));
  const guests = results.at(-1)!;
  const difference = guests.medianDifferenceUs!;
  bar(
    'round trip, 20 dashboards, over C (median difference <= 100 us)',
    `${difference.toFixed(0)} us`,
    difference <= 100,
  );
  const ratio = guests.p999Ratio!;
  bar("round trip, 20 dashboards, p99.9 <= twice C's", `${ratio.toFixed(2)} times`, ratio <= 2);
}

async function rehearsal(): Promise<void> {
  const { sessionHours, inputs, rehearsedS, replayedS, identical } = await benchRehearsal();
  const list = (seconds: readonly number[]) => seconds.map((s) => s.toFixed(2)).join(' ');
  console.log(`an hour with ten rules, recorded, ${inputs} inputs, seconds: ${list(rehearsedS)}`);
  const seconds = median(rehearsedS);
  console.log(`  ${(sessionHours / seconds).toFixed(2)} session-hours a second`);
  bar('rehearsing an hour (<= 2 s)', `${seconds.toFixed(2)} s, median`, seconds <= 2);
  console.log(`replaying it, identical: ${identical}, seconds: ${list(replayedS)}`);
  const perSecond = inputs / median(replayedS);
  bar(
    'replaying (>= 1.5 million frames a second)',
    `${(perSecond / 1e6).toFixed(2)} million, median`,
    perSecond >= 1.5e6,
  );
}

async function runs(): Promise<void> {
  const { runs: count, jobs, sessionMin, tookS, cpuS } = await benchRuns();
  console.log(
    `${count} sessions of ${sessionMin.toFixed(0)} min with ten rules on ${jobs} threads: ${tookS.toFixed(1)} s, ${cpuS.toFixed(1)} s of processor time`,
  );
  bar('rehearsing 500 sessions of 45 min (<= 60 s)', `${tookS.toFixed(1)} s`, tookS <= 60);
}

async function engine(): Promise<void> {
  for (const { what, rules, nsPerFrame, bytesPerFrame } of await benchEngine()) {
    console.log(
      `${what}, ${rules} rules: ${nsPerFrame.toFixed(0)} ns and ${bytesPerFrame.toFixed(2)} bytes a frame`,
    );
  }
}

function wire(): void {
  const { decodedMBPerS, framesPerS, allocatedBytesPerFrame, encodedFramesPerS } = benchWire();
  console.log(
    `decoder: ${decodedMBPerS.toFixed(1)} MB/s, ${(framesPerS / 1e6).toFixed(2)} million frames/s, ${allocatedBytesPerFrame.toFixed(2)} bytes allocated a frame`,
  );
  console.log(`encoder: ${(encodedFramesPerS / 1e6).toFixed(2)} million frames/s`);
}

async function record(): Promise<void> {
  const r = await benchRecord();
  console.log(
    `recording: ${r.liveNsPerSample.toFixed(0)} ns a sample live, ${r.bulkNsPerSample.toFixed(0)} ns in a rehearsal, ${r.liveHeapBytesPerSample.toFixed(2)} bytes allocated`,
  );
  bar(
    'recording live (< 2 % of a core)',
    `${(r.liveShareOfCore * 100).toFixed(2)} %`,
    r.liveShareOfCore < 0.02,
  );
  bar(
    'a finished record (< 30 MB an hour)',
    `${r.finishedMBPerHour.toFixed(1)} MB (${r.liveMBPerHour.toFixed(1)} while live), finished in ${r.finishS.toFixed(1)} s`,
    r.finishedMBPerHour < 30,
  );
  console.log(
    `decoding: ${(r.decodedLiveSamplesPerS / 1e6).toFixed(1)} million samples a second live, ${(r.decodedFinishedSamplesPerS / 1e6).toFixed(1)} finished`,
  );
}

function memory(): void {
  const { heapMB } = benchMemory();
  console.log(
    `heap after each of eight hours of session, MB: ${heapMB.map((mb) => mb.toFixed(1)).join(' ')}`,
  );
  const grown = heapMB.at(-1)! - heapMB[0]!;
  bar(
    'loop memory over eight hours (flat)',
    `${grown.toFixed(2)} MB more in the eighth than in the first`,
    grown < 1,
  );
}

async function firmware(): Promise<void> {
  for (const board of ['atmega328p', 'atmega2560'] as const) {
    const figures = await benchFirmware(board);
    console.log(`the committed program for the ${board}, emulated`);
    for (const { edgesPerS, edges, lost } of figures.counts) {
      const figure = `${lost} of ${edges} lost`;
      if (edgesPerS < 60_000) bar(`counts at ${edgesPerS} edges/s (none lost)`, figure, lost === 0);
      else console.log(`        counts at ${edgesPerS} edges/s: ${figure}`);
    }
    for (const shots of figures.edgeToOutput) {
      const { minUs, medianUs, p99Us, maxUs } = shots;
      const figure = [minUs, medianUs, p99Us, maxUs].map((us) => us.toFixed(2)).join(' / ');
      bar(
        `edge to output at ${shots.edgesPerS} edges/s, min / median / p99 / max (<= 10 us)`,
        `${figure} us, ${shots.missed} of ${shots.shots} missed`,
        maxUs <= 10 && shots.missed === 0,
      );
      width('of one output', shots.widthErrorUs);
    }
    width('of outputs that end together', figures.widthErrorUs);
    const { cycles, hits, edges } = figures.off;
    bar(
      'interrupts off (< 100 cycles)',
      `${cycles} cycles (${(cycles / CYCLES_PER_US).toFixed(1)} us) at most, over ${hits} hits and ${edges} edges`,
      cycles < 100,
    );
    console.log(
      `        watchdog: ${(figures.watchdogUs / 1000).toFixed(1)} ms; ${figures.stackLeftBytes} bytes of stack never reached`,
    );
  }
}

function width(what: string, { pulses, least, most }: WidthErrors): void {
  const figure = `${least.toFixed(1)} to ${most.toFixed(1)} us over ${pulses} pulses`;
  bar(`pulse width ${what} (within 20 us)`, figure, least >= -20 && most <= 20);
}

async function viewers(): Promise<void> {
  const r = await benchViewers();
  const line = (what: string, { n, p50, p99, p999, max }: typeof r.alone) =>
    console.log(
      `${what}: ${n} round trips, us: p50 ${p50.toFixed(0)}, p99 ${p99.toFixed(0)}, p99.9 ${p999.toFixed(0)}, max ${max.toFixed(0)}`,
    );
  line('watched by nobody', r.alone);
  line(`watched by ${r.viewers}`, r.watched);
  console.log(
    `each viewer got ${r.messagesPerS.toFixed(1)} messages and ${(r.bytesPerS / 1000).toFixed(1)} kB a second; ${r.lost} lost their socket, ${r.unanswered} causes unanswered`,
  );
  const ratios = r.p99Ratios.map((ratio) => ratio.toFixed(2)).join(' ');
  const pooled = r.watched.p99 / r.alone.p99;
  console.log(`p99 watched over alone, pair by pair: ${ratios}; all together ${pooled.toFixed(2)}`);
  bar(
    `the loop's p99 with ${r.viewers} viewers (within 10 % of none)`,
    `${((r.medianP99Ratio - 1) * 100).toFixed(0)} %, median of the pairs`,
    r.medianP99Ratio <= 1.1,
  );
  bar('the web process (within one core)', `${(r.coreShare * 100).toFixed(0)} %`, r.coreShare < 1);
  const [first, last] = [r.memoryMb[0]!, r.memoryMb.at(-1)!];
  bar(
    'its memory (bounded)',
    `${first} MB in the first watched turn, ${last} MB in the last, ${Math.max(...r.memoryMb)} MB at most`,
    last < first * 1.5,
  );
}

const PARTS = {
  wire,
  engine,
  record,
  rehearsal,
  runs,
  memory,
  firmware,
  'round-trip': roundTrip,
  viewers,
} as const;

const asked = process.argv.slice(2);
const unknown = asked.filter((name) => !(name in PARTS));
if (unknown.length > 0) {
  console.error(`no such part: ${unknown.join(', ')}; there are ${Object.keys(PARTS).join(', ')}`);
  process.exit(2);
}
console.log(
  `Node ${process.version}, ${process.platform} ${release()} ${arch()}, ${cpus().length} x ${cpus()[0]?.model}, load ${loadavg()[0]!.toFixed(1)}`,
);
for (const [name, run] of Object.entries(PARTS)) {
  if (asked.length > 0 && !asked.includes(name)) continue;
  console.log(`\n== ${name}`);
  await run();
}
