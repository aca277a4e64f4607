import { Command, InvalidArgumentError } from 'commander';
import type { BoardLine } from '../../hardware-sim/conformance/boardLine.js';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { NotConforming } from '../../hardware-sim/conformance/frameHost.js';
import {
  type Loopback,
  measureDrift,
  measureLoopback,
  measureRoundTrip,
  type RoundTrip,
} from '../../hardware-sim/conformance/measures.js';
import { runScript, type ScriptResult } from '../../hardware-sim/conformance/run.js';
import { SCRIPTS, type Script } from '../../hardware-sim/conformance/scripts.js';
import { LapwingError } from '../errors/codes.js';
import type { BytePort } from '../link/bytePort.js';
import { portOpener } from '../link/resolvePort.js';
import type { Identity } from '../wire/messages.js';
import { wholeNumber } from './arguments.js';

interface SelftestFlags {
  outputsFree?: boolean;
  baud: number;
  loopback?: { output: number; input: number };
  measure: boolean;
  drift: number;
  json?: boolean;
}

/** What `--json` prints; a measure that was not made is absent. */
interface SelftestReport {
  board: Pick<Identity, 'model' | 'firmware' | 'boardId' | 'outputs' | 'inputs' | 'slots'>;
  scripts: { name: string; rules: string; result: ScriptResult['result']; why: string | null }[];
  conforms: boolean;
  roundTrip?: RoundTrip;
  /** How much faster the board's clock runs than this computer's. */
  driftPpm?: number;
  loopback?: Loopback;
  /** Why a measure could not be made. */
  notMeasured?: string;
}

/** Long enough for a boot loader that runs when the port is opened. */
const BOOT_MS = 2_500;
/** A script that fails is tried again: as often as this if it was the board, */
const ATTEMPTS = 3;
/** and as often as this where this computer was held up meanwhile, which proves nothing of a board. */
const HELD_UP_ATTEMPTS = 12;
const HELD_UP_MS = 20;

/** `lapwing selftest PORT`: the conformance suite on a real board, and what it can measure there. */
export function selftestCommand(): Command {
  return new Command('selftest')
    .description('run the conformance suite on a board that is attached, and measure it')
    .argument('<port>', 'the board: a device path, or tcp://host:port')
    .option('--outputs-free', 'nothing is wired to the outputs: they will pulse')
    .option('--baud <rate>', 'bits per second', wholeNumber(9_600, 4_000_000), 500_000)
    .option('--loopback <out:in>', 'a wire joins this output to this input', outAndIn)
    .option('--no-measure', 'the suite alone')
    .option('--drift <s>', 'how long to watch the clocks, seconds', wholeNumber(1, 3_600), 10)
    .option('--json', 'print the result for scripts, and nothing else')
    .action(async (address: string, flags: SelftestFlags) => {
      if (flags.outputsFree !== true) {
        throw new LapwingError('selftestOutputs', 'The self test makes outputs pulse.');
      }
      const port = await portOpener(address, { baudRate: flags.baud })();
      const line = portLine(port);
      try {
        await line.wait(BOOT_MS * 1_000);
        if (!(await selftest(line, flags))) process.exitCode = 1;
      } finally {
        await port.close();
      }
    });
}

async function selftest(line: PortLine, flags: SelftestFlags): Promise<boolean> {
  const tell = (text: string) => {
    if (flags.json !== true) process.stdout.write(`${text}\n`);
  };
  const host = new ConformanceHost(line);
  await host.connect();
  const { model, firmware, boardId, outputs, inputs, slots } = host.identity;
  tell(`${model}, firmware ${firmware}, board ${boardId}`);
  tell(`${outputs} outputs, ${inputs} inputs, ${slots} slots`);
  const board = { model, firmware, boardId, outputs, inputs, slots };
  const report: SelftestReport = { board, scripts: [], conforms: true };
  for (const script of SCRIPTS) {
    const result = await patiently(host, line, script, tell);
    if (result.result === 'does not') report.conforms = false;
    const { name, rules } = script;
    report.scripts.push({ name, rules, result: result.result, why: result.why ?? null });
    tell(resultLine(result));
  }
  const failed = report.scripts.filter(({ result }) => result === 'does not').length;
  tell(report.conforms ? 'the board conforms' : `${failed} scripts failed`);
  if (flags.measure) {
    try {
      await measure(host, flags, report, tell);
    } catch (error) {
      if (!(error instanceof NotConforming)) throw error;
      report.notMeasured = error.message;
      tell(`not measured: ${error.message}`);
    }
  }
  if (flags.json) process.stdout.write(`${JSON.stringify(report, null, 2)}\n`);
  return report.conforms && report.notMeasured === undefined;
}

/** The script's last result: a computer that is held up trips the board's watchdog, rightly. */
async function patiently(
  host: ConformanceHost,
  line: PortLine,
  script: Script,
  tell: (text: string) => void,
): Promise<ScriptResult> {
  let failures = 0;
  for (let tries = 1; ; tries++) {
    line.longestLateMs = 0;
    const result = await runScript(host, script);
    const heldUp = line.longestLateMs > HELD_UP_MS;
    if (result.result !== 'does not') return result;
    if (!heldUp) failures++;
    if (failures === ATTEMPTS || tries === HELD_UP_ATTEMPTS) return result;
    const why = heldUp ? `this computer was held up for ${Math.round(line.longestLateMs)} ms` : '';
    tell(`     again${why ? `, since ${why}` : ''}: ${script.name}: ${result.why}`);
  }
}

async function measure(
  host: ConformanceHost,
  flags: SelftestFlags,
  report: SelftestReport,
  tell: (text: string) => void,
): Promise<void> {
  const clock = () => performance.now() * 1_000;
  const trip = await measureRoundTrip(host, clock);
  report.roundTrip = trip;
  tell(`round trip: median ${Math.round(trip.medianUs)} us, most ${Math.round(trip.mostUs)} us`);
  tell(`watching the clocks for ${flags.drift} s`);
  const ppm = await measureDrift(host, clock, flags.drift);
  report.driftPpm = ppm;
  tell(`board clock: ${ppm >= 0 ? '+' : ''}${ppm.toFixed(1)} ppm against this computer's`);
  if (flags.loopback === undefined) return;
  const { output, input } = flags.loopback;
  const loop = await measureLoopback(host, output, input);
  report.loopback = loop;
  const from = `output ${output} to input ${input}: ${loop.seen} of ${loop.pulses} seen`;
  tell(`${from}, median ${loop.medianUs} us, most ${loop.mostUs} us`);
}

function resultLine({ script, result, why }: ScriptResult): string {
  const mark = { conforms: 'ok  ', 'does not': 'FAIL', 'not possible here': '--  ' }[result];
  const needs = result === 'not possible here' ? ` (needs what this bench lacks: ${why})` : '';
  const found = result === 'does not' ? `\n       ${why} (rules ${script.rules})` : '';
  return `${mark} ${script.name}${needs}${found}`;
}

interface PortLine extends BoardLine {
  /** How much longer than asked for a wait has taken, the longest since this was last set to 0. */
  longestLateMs: number;
}

/** A real port on the suite's line: time there is the computer's own. */
function portLine(port: BytePort): PortLine {
  const line: PortLine = {
    name: port.name,
    realTime: true,
    longestLateMs: 0,
    heard: () => {},
    write(bytes) {
      if (!port.write(bytes)) {
        throw new LapwingError('linkWriteFailed', `${port.name} did not take every byte.`);
      }
    },
    async wait(us) {
      const fromMs = performance.now();
      await new Promise<void>((resolve) => {
        if (us === 0) setImmediate(resolve);
        else setTimeout(resolve, us / 1_000);
      });
      const lateMs = performance.now() - fromMs - us / 1_000;
      if (lateMs > line.longestLateMs) line.longestLateMs = lateMs;
    },
  };
  port.listen({
    bytes: (bytes) => line.heard(bytes),
    closed: (why) => {
      throw why;
    },
  });
  return line;
}

function outAndIn(text: string): { output: number; input: number } {
  const found = /^(\d{1,2}):(\d{1,2})$/.exec(text);
  if (found === null) throw new InvalidArgumentError('expected OUTPUT:INPUT, such as 0:2');
  return { output: Number(found[1]), input: Number(found[2]) };
}
