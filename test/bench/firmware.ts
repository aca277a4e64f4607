/**
 * What the firmware does, measured on the committed .hex under emulation: the figures are of the
 * program, not of this machine. `benchFirmware` is the whole of it; the tests take less of each.
 */

import { Dice } from '../../hardware-sim/animal/dice.js';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine } from '../../hardware-sim/conformance/lines.js';
import { CYCLES_PER_US } from '../../hardware-sim/emulator/chip.js';
import {
  type EmulatedBoard,
  type EmulatedBoardName,
  fillMemory,
} from '../../hardware-sim/emulator/emulatedBoard.js';
import { FAULT, OUTCOME } from '../../server/wire/messages.js';
import { presetCount } from '../firmware/presets.js';
import { quantile } from './statistics.js';

/** Odd rates: round ones lock to the 1 kHz tick and hide losses. */
export const EDGE_RATES = [5_021, 20_011, 50_021, 80_021] as const;

export interface CountFigures {
  readonly edgesPerS: number;
  readonly edges: number;
  readonly lost: number;
  readonly illegal: number;
  readonly overruns: number;
}

export interface LatencyFigures {
  readonly edgesPerS: number;
  readonly shots: number;
  readonly missed: number;
  readonly minUs: number;
  readonly medianUs: number;
  readonly p99Us: number;
  readonly maxUs: number;
  /** Of pulses of `widthUs`: measured less asked for. */
  readonly widthErrorUs: WidthErrors;
}

/** Measured less asked for, microseconds. */
export interface WidthErrors {
  readonly pulses: number;
  readonly least: number;
  readonly most: number;
}

export interface OffFigures {
  /** The longest stretch with interrupts off, cycles of the chip. */
  readonly cycles: number;
  /** Slots that fired meanwhile, and changes of inputs. */
  readonly hits: number;
  readonly edges: number;
}

export interface FirmwareFigures {
  readonly board: string;
  readonly counts: readonly CountFigures[];
  readonly edgeToOutput: readonly LatencyFigures[];
  /** Of outputs that end together, a little apart, and in trains that overlap. */
  readonly widthErrorUs: WidthErrors;
  readonly off: OffFigures;
  /** From the last finished stamp to idle outputs, microseconds. */
  readonly watchdogUs: number;
  /** Bytes of memory that the stack was never seen to reach. */
  readonly stackLeftBytes: number;
}

interface Bench {
  readonly host: ConformanceHost;
  readonly board: EmulatedBoard;
}

async function bench(name: EmulatedBoardName): Promise<Bench> {
  const line = emulatedLine({ board: name });
  const host = new ConformanceHost(line);
  await host.connect();
  return { host, board: line.board };
}

/** Runs the encoder at a rate, calling `every` about each millisecond; 256 edges a bit unevenly. */
function run(board: EmulatedBoard, edgesPerS: number, edges: number, every: () => void): void {
  const cycles = (16e6 as number) / edgesPerS;
  const from = board.cycle;
  let nextMs = from;
  for (let n = 1; n <= edges; n++) {
    board.runToCycle(from + n * cycles);
    board.step(1);
    if (board.cycle < nextMs) continue;
    nextMs += 16_000;
    every();
  }
}

/** Counts against edges, with the line streaming both ways. */
export async function measureCounts(
  name: EmulatedBoardName,
  edgesPerS: number,
  edges: number,
): Promise<CountFigures> {
  const { host, board } = await bench(name);
  const before = host.last(host.samples, 'sample');
  let ms = 0;
  run(board, edgesPerS, edges, () => {
    if (ms++ % 4 === 0) host.beat();
    if (ms % 10 === 0) host.pulse({ widthUs: 3_000 });
  });
  await host.live(20_000);
  const after = host.last(host.samples, 'sample');
  return {
    edgesPerS,
    edges,
    lost: edges - (after.count - before.count),
    illegal: after.illegal - before.illegal,
    overruns: after.overruns,
  };
}

/** Armed shots, one after another, while the host beats and asks for pulses elsewhere. */
export async function measureEdgeToOutput(
  name: EmulatedBoardName,
  edgesPerS: number,
  shots: number,
): Promise<LatencyFigures> {
  const { host, board } = await bench(name);
  host.configure({ output: 2 });
  const widthUs = 1_000;
  // Enough counts that the arm arrives in time, however fast the belt.
  const apart = Math.ceil(edgesPerS * 0.006);
  const latenciesUs: number[] = [];
  const errorsUs: number[] = [];
  let target = Number.NaN;
  let edgeCycle = Number.NaN;
  let roseCycle = Number.NaN;
  board.probe = (output, level, cycle) => {
    if (output !== 0) return;
    if (level === 1) {
      latenciesUs.push((cycle - edgeCycle) / CYCLES_PER_US);
      roseCycle = cycle;
    } else {
      errorsUs.push((cycle - roseCycle) / CYCLES_PER_US - widthUs);
    }
  };
  let count = host.count;
  const cycles = 16e6 / edgesPerS;
  let next = board.cycle;
  let nextMs = next;
  let ms = 0;
  for (let shot = 0; shot < shots; shot++) {
    target = count + apart;
    host.arm({ slot: shot % 8, output: 0, count: target, widthUs });
    while (count < target + 3) {
      next += cycles;
      board.runToCycle(next);
      if (count + 1 === target) edgeCycle = next;
      board.step(1);
      count++;
      if (board.cycle < nextMs) continue;
      nextMs += 16_000;
      // The host's half of the line: a beat each 4 ms, and a pulse elsewhere now and then.
      if (ms++ % 4 === 0) host.beat();
      if (ms % 16 === 0) host.pulse({ output: 2, widthUs: 2_000 });
    }
  }
  await host.live(20_000);
  latenciesUs.sort((a, b) => a - b);
  return {
    edgesPerS,
    shots,
    missed: shots - latenciesUs.length,
    minUs: latenciesUs[0]!,
    medianUs: quantile(latenciesUs, 0.5),
    p99Us: quantile(latenciesUs, 0.99),
    maxUs: latenciesUs.at(-1)!,
    widthErrorUs: rangeOf(errorsUs),
  };
}

const rangeOf = (errorsUs: readonly number[]): WidthErrors => ({
  pulses: errorsUs.length,
  least: Math.min(...errorsUs),
  most: Math.max(...errorsUs),
});

/** How far apart outputs are to end, microseconds: together, within one interrupt, and beyond it. */
const APART_US = [0, 1, 2, 3, 5, 9, 20, 150];

/**
 * Widths on every output at once: ends that fall on one another or a little apart, by pulses and by
 * trains whose falls and rises cross, while the belt runs and the host beats.
 */
export async function measureWidths(
  name: EmulatedBoardName,
  apartUs: readonly number[] = APART_US,
): Promise<WidthErrors> {
  const { host, board } = await bench(name);
  const { outputs } = host.identity;
  for (let output = 2; output < outputs; output++) host.configure({ output });
  await host.live(10_000);
  const roseCycle: number[] = [];
  const widthsUs: number[] = [];
  const errorsUs: number[] = [];
  board.probe = (output, level, cycle) => {
    if (level === 1) roseCycle[output] = cycle;
    else errorsUs.push((cycle - roseCycle[output]!) / CYCLES_PER_US - widthsUs[output]!);
  };
  for (const apart of apartUs) {
    const startUs = host.boardUs + 20_000;
    for (let output = 0; output < outputs; output++) {
      const at = startUs + output * 900;
      widthsUs[output] = 10_000 - output * 900 + output * apart;
      const expiryUs = at + 10_000;
      host.pulse({ output, flags: 1, startUs: at, expiryUs, widthUs: widthsUs[output]! });
      run(board, 5_021, 10, () => host.beat());
    }
    run(board, 20_011, 1_000, () => host.beat());
  }
  for (let output = 0; output < outputs; output++) {
    const widthUs = 1_100 + output * 100;
    widthsUs[output] = widthUs;
    host.pulse({ output, widthUs, periodUs: 7_000 + output * 37, repeats: 20 });
    run(board, 5_021, 10, () => host.beat());
  }
  run(board, 5_021, 900, () => host.beat());
  return rangeOf(errorsUs);
}

/** The longest stretch with interrupts off, under everything that the board can be asked for at once. */
export async function measureInterruptsOff(
  name: EmulatedBoardName,
  ms: number,
): Promise<OffFigures> {
  const { host, board } = await bench(name);
  const { outputs, inputs, slots } = host.identity;
  for (let output = 2; output < outputs; output++) host.configure({ output });
  await host.live(10_000);
  const last = outputs - 1;
  const gaps = { leastGapUs: 2_000, mostGapUs: 6_000, seed: 3 };
  host.send('sync', { output: last, running: 1, widthUs: 300, ...gaps });
  const dice = new Dice(4);
  const below = (n: number) => Math.floor(dice.unit() * n);
  board.chip.longestOffCycles = 0;
  for (let n = 0; n < ms; n++) {
    if (n % 4 === 0) host.beat();
    if (n % 10 === 0) host.pulse({ output: below(last), widthUs: 100 + below(3_000) });
    if (n % 4 === 2) {
      // Every other one where a byte or three of the count carry, which takes the interrupt longest.
      const carries = (host.count + 0x200) & ~0xff;
      const count = n % 8 === 2 ? carries : host.count + 60 + below(60);
      host.arm({ slot: below(slots), output: below(last), count, widthUs: 200 + below(900) });
    }
    if (n % 20 === 0) board.setInput(below(inputs), below(2) as 0 | 1);
    if (n === ms >> 1) presetCount(board, 0xff_ff80);
    const from = board.cycle;
    for (let edge = 1; edge <= 20; edge++) {
      board.runToCycle(from + edge * 800);
      board.step(n % 50 < 38 ? 1 : -1);
    }
  }
  const cycles = board.chip.longestOffCycles;
  await host.live(20_000);
  const hits = host.outcomes.filter(({ kind }) => kind === OUTCOME.fired).length;
  return { cycles, hits, edges: host.edges.filter(({ input }) => input < inputs).length };
}

/** How long after the last finished stamp a silent host's pulse is cut. */
export async function measureWatchdog(name: EmulatedBoardName): Promise<number> {
  const { host, board } = await bench(name);
  host.pulse({ widthUs: 900_000 });
  await host.live(10_000);
  await host.silent(2_000);
  const stampUs = host.boardUs;
  host.beat(stampUs);
  let fellUs = Number.NaN;
  board.probe = (_output, level) => {
    if (level === 0) fellUs = board.boardUs;
  };
  await host.silent(300_000);
  if (!host.faults.some(({ fault }) => fault === FAULT.watchdogOutputs)) return Number.NaN;
  return fellUs - stampUs;
}

/** Memory that neither variables nor the stack have used, under a heavy load. */
export async function measureStack(name: EmulatedBoardName): Promise<number> {
  const { host, board } = await bench(name);
  const { cpu } = board.chip;
  const { ramStart } = board.chip.layout;
  const noise = new Uint8Array(cpu.data.length);
  fillMemory(noise, ramStart, 1);
  let id = 0;
  const count = host.count;
  run(board, 20_011, 6_000, () => {
    board.setInput(id % 5, id % 2 === 0 ? 1 : 0);
    board.setInput((id + 3) % 5, id % 3 === 0 ? 1 : 0);
    if (id++ % 3 === 0) host.beat();
    if (id % 5 === 0) host.pulse({ output: id % 2, widthUs: 700, periodUs: 1_500, repeats: 3 });
    if (id % 7 === 0) host.arm({ slot: id % 8, count: count + id * 20 + 200, widthUs: 300 });
  });
  // Memory that still holds what it held at power-on: neither a variable nor ever stack.
  let longest = 0;
  let length = 0;
  for (let at = ramStart; at < cpu.data.length; at++) {
    length = cpu.data[at] === noise[at] ? length + 1 : 0;
    longest = Math.max(longest, length);
  }
  return longest;
}

/** Everything, as the bench tells it. */
export async function benchFirmware(
  name: EmulatedBoardName = 'atmega328p',
  scale = 1,
): Promise<FirmwareFigures> {
  const counts: CountFigures[] = [];
  for (const rate of EDGE_RATES) counts.push(await measureCounts(name, rate, scale * 2 * rate));
  const edgeToOutput: LatencyFigures[] = [];
  for (const rate of [20_011, 50_021]) {
    edgeToOutput.push(await measureEdgeToOutput(name, rate, scale * 1_000));
  }
  return {
    board: name,
    counts,
    edgeToOutput,
    widthErrorUs: await measureWidths(name),
    off: await measureInterruptsOff(name, scale * 3_000),
    watchdogUs: await measureWatchdog(name),
    stackLeftBytes: await measureStack(name),
  };
}
