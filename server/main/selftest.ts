import { Command, InvalidArgumentError } from 'commander';
import type { BoardLine } from '../../hardware-sim/conformance/boardLine.js';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { NotConforming } from '../../hardware-sim/conformance/frameHost.js';
import {
  measureDrift,
  measureLoopback,
  measureRoundTrip,
} from '../../hardware-sim/conformance/measures.js';
import { runScript, type ScriptResult } from '../../hardware-sim/conformance/run.js';
import { SCRIPTS } from '../../hardware-sim/conformance/scripts.js';
import { LapwingError } from '../errors/codes.js';
import type { BytePort } from '../link/bytePort.js';
import { portOpener } from '../link/resolvePort.js';
import { wholeNumber } from './arguments.js';

interface SelftestFlags {
  outputsFree?: boolean;
  baud: number;
  loopback?: { output: number; input: number };
  measure: boolean;
}

/** Long enough for a boot loader that runs when the port is opened. */
const BOOT_MS = 2_500;
const ATTEMPTS = 3;

/** `lapwing selftest PORT`: the conformance suite on a real board, and what it can measure there. */
export function selftestCommand(): Command {
  return new Command('selftest')
    .description('run the conformance suite on a board that is attached, and measure it')
    .argument('<port>', 'the board: a device path, or tcp://host:port')
    .option('--outputs-free', 'nothing is wired to the outputs: they will pulse')
    .option('--baud <rate>', 'bits per second', wholeNumber(9_600, 4_000_000), 500_000)
    .option('--loopback <out:in>', 'a wire joins this output to this input', outAndIn)
    .option('--no-measure', 'the suite alone')
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

async function selftest(line: BoardLine, flags: SelftestFlags): Promise<boolean> {
  const host = new ConformanceHost(line);
  await host.connect();
  const { model, firmware, boardId, outputs, inputs, slots } = host.identity;
  tell(`${model}, firmware ${firmware}, board ${boardId}`);
  tell(`${outputs} outputs, ${inputs} inputs, ${slots} slots`);
  let failed = 0;
  for (const script of SCRIPTS) {
    let result = await runScript(host, script);
    // A computer that is held up for a quarter of a second trips the board's watchdog, rightly.
    for (let n = 1; n < ATTEMPTS && result.result === 'does not'; n++) {
      tell(`     again, since this computer may have been held up: ${script.name}: ${result.why}`);
      result = await runScript(host, script);
    }
    if (result.result === 'does not') failed++;
    tell(resultLine(result));
  }
  tell(failed === 0 ? 'the board conforms' : `${failed} scripts failed`);
  if (flags.measure) {
    try {
      await measure(host, flags);
    } catch (error) {
      if (!(error instanceof NotConforming)) throw error;
      tell(`not measured: ${error.message}`);
      return false;
    }
  }
  return failed === 0;
}

async function measure(host: ConformanceHost, flags: SelftestFlags): Promise<void> {
  const clock = () => performance.now() * 1_000;
  const trip = await measureRoundTrip(host, clock);
  tell(`round trip: median ${Math.round(trip.medianUs)} us, most ${Math.round(trip.mostUs)} us`);
  const ppm = await measureDrift(host, clock);
  tell(`board clock: ${ppm >= 0 ? '+' : ''}${ppm.toFixed(1)} ppm against this computer's`);
  if (flags.loopback === undefined) return;
  const { output, input } = flags.loopback;
  const loop = await measureLoopback(host, output, input);
  const from = `output ${output} to input ${input}: ${loop.seen} of ${loop.pulses} seen`;
  tell(`${from}, median ${loop.medianUs} us, most ${loop.mostUs} us`);
}

function resultLine({ script, result, why }: ScriptResult): string {
  const mark = { conforms: 'ok  ', 'does not': 'FAIL', 'not possible here': '--  ' }[result];
  const needs = result === 'not possible here' ? ` (needs what this bench lacks: ${why})` : '';
  const found = result === 'does not' ? `\n       ${why} (rules ${script.rules})` : '';
  return `${mark} ${script.name}${needs}${found}`;
}

/** A real port on the suite's line: time there is the computer's own. */
function portLine(port: BytePort): BoardLine {
  const line: BoardLine = {
    name: port.name,
    realTime: true,
    heard: () => {},
    write(bytes) {
      if (!port.write(bytes)) {
        throw new LapwingError('linkWriteFailed', `${port.name} did not take every byte.`);
      }
    },
    wait: (us) =>
      new Promise((resolve) => {
        if (us === 0) setImmediate(resolve);
        else setTimeout(resolve, us / 1_000);
      }),
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

function tell(line: string): void {
  process.stdout.write(`${line}\n`);
}
