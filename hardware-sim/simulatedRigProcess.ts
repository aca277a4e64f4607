/**
 * The simulated rig as a process of its own: a board on a real pseudo-terminal (or over TCP), paced
 * to the wall clock. It prints `{"port": ...}` once it can be opened, takes commands a line each on
 * standard input, answers each with a line of JSON, and ends when its parent does.
 *
 *     node dist/hardware-sim/simulatedRigProcess.js --seed 3 --trained --link /tmp/lapwing-board
 */
import fs from 'node:fs';
import net from 'node:net';
import { createInterface } from 'node:readline';
import { parseArgs } from 'node:util';
import type { ByteLine } from './realTime/byteLine.js';
import { type CommandAnswer, runCommand } from './realTime/lineCommands.js';
import { PacedRig } from './realTime/pacedRig.js';
import { PtyLine } from './realTime/ptyLine.js';
import { TcpLine } from './realTime/tcpLine.js';
import type { SimulatedRigOptions } from './simulatedRig.js';

const PARENT_CHECK_MS = 500;

const HELP = `Options:
  --seed N            the animal's and the belt's chance (default 1)
  --trained           the animal knows where water comes
  --spout-cm X        where that is (default: half way)
  --start-cm X        where the animal stands at first
  --belt-cm X         belt length (default 180)
  --counts-per-cm X   encoder counts per cm of belt (default 20)
  --slip-mm X         what the encoder reads too much per lap (default 1)
  --reversed          the encoder counts down as the animal runs
  --no-mark           the belt has no seam mark
  --mark-miss P       chance that a mark is missed
  --lick-input N      input of the lick sensor (default 0)
  --seam-input N      input of the seam sensor (default 1)
  --valve-output N    output of the water valve (default 0)
  --valve-dead-us X --valve-us-per-ul X   the valve's line
  --loopback OUT:IN   a wire from an output to an input
  --hands PATH        take the same commands over a local socket at PATH, from whoever connects
  --board-id N        the board's own number
  --start-us X        what the board's clock shows at first
  --emulated          the board is the firmware's own program, run by an emulator
  --link PATH         keep a symbolic link to the port at PATH
  --tcp PORT          serve TCP on this machine instead of a pseudo-terminal (0: any free port)
Commands on standard input, a line each:
  unplug   replug   reset   stall MS   speed CM_S   speed off   noise P   state   quit
  turn CM [CM_S]   tap INPUT   touch TIMES   vial on   vial off   weigh
`;

const { values } = parseArgs({
  options: {
    seed: { type: 'string' },
    trained: { type: 'boolean' },
    'spout-cm': { type: 'string' },
    'start-cm': { type: 'string' },
    'belt-cm': { type: 'string' },
    'counts-per-cm': { type: 'string' },
    'slip-mm': { type: 'string' },
    reversed: { type: 'boolean' },
    'no-mark': { type: 'boolean' },
    'mark-miss': { type: 'string' },
    'lick-input': { type: 'string' },
    'seam-input': { type: 'string' },
    'valve-output': { type: 'string' },
    'valve-dead-us': { type: 'string' },
    'valve-us-per-ul': { type: 'string' },
    loopback: { type: 'string' },
    hands: { type: 'string' },
    'board-id': { type: 'string' },
    'start-us': { type: 'string' },
    emulated: { type: 'boolean' },
    link: { type: 'string' },
    tcp: { type: 'string' },
    help: { type: 'boolean' },
  },
});

/** The option's number under the name that the rig calls it by, or nothing. */
function number<K extends string>(option: keyof typeof values, name: K, scale = 1) {
  const text = values[option];
  if (typeof text !== 'string') return {} as Partial<Record<K, number>>;
  const value = Number(text);
  if (text.trim() === '' || !Number.isFinite(value)) fail(`--${option}: ${text} is no number.`);
  return { [name]: value * scale } as Record<K, number>;
}

function rigOptions(): SimulatedRigOptions {
  return {
    ...number('seed', 'seed'),
    trained: values.trained === true,
    reversed: values.reversed === true,
    ...number('spout-cm', 'spoutCm'),
    ...number('start-cm', 'startCm'),
    belt: {
      ...number('belt-cm', 'lengthCm'),
      ...number('counts-per-cm', 'countsPerCm'),
      ...number('slip-mm', 'slipPerLapCm', 0.1),
      ...number('mark-miss', 'markMissChance'),
      ...(values['no-mark'] ? { mark: false } : {}),
    },
    wiring: {
      ...number('lick-input', 'lickInput'),
      ...number('seam-input', 'seamInput'),
      ...number('valve-output', 'valveOutput'),
    },
    valve: { ...number('valve-dead-us', 'deadUs'), ...number('valve-us-per-ul', 'usPerUl') },
    ...loopback(),
    board: { ...number('board-id', 'boardId'), ...number('start-us', 'startUs') },
  };
}

function loopback(): Pick<SimulatedRigOptions, 'loopback'> {
  if (values.loopback === undefined) return {};
  const [output, input] = values.loopback.split(':').map(Number);
  if (!Number.isInteger(output) || !Number.isInteger(input)) {
    fail(`--loopback: ${values.loopback} is not OUTPUT:INPUT.`);
  }
  return { loopback: { output: output!, input: input! } };
}

function fail(message: string): never {
  process.stderr.write(`${message}\n`);
  process.exit(1);
}

function say(answer: CommandAnswer): void {
  process.stdout.write(`${JSON.stringify(answer)}\n`);
}

async function main(): Promise<void> {
  if (values.help) {
    process.stdout.write(HELP);
    return;
  }
  const paced = new PacedRig(rigOptions(), values.emulated === true);
  const heard = (bytes: Uint8Array) => paced.heard(bytes);
  let line: ByteLine;
  try {
    const tcp = number('tcp', 'port').port;
    line =
      tcp === undefined
        ? await PtyLine.create(heard, values.link)
        : await TcpLine.create(heard, tcp);
  } catch (error) {
    fail((error as Error).message);
  }
  paced.line = line;
  const leave = (): never => {
    paced.stop();
    line.unplug();
    process.exit(0);
  };
  endWithParent(leave);
  const obey = async (text: string, answerTo: (answer: CommandAnswer) => void) => {
    const answer = await runCommand(text, paced, line);
    if (answer === 'quit') leave();
    else answerTo(answer);
  };
  createInterface({ input: process.stdin }).on('line', (text) => void obey(text, say));
  if (values.hands !== undefined) await takeHands(values.hands, obey);
  say({ port: line.port });
  paced.start();
}

/** The hands that a rig needs, for whoever rehearses with it: commands over a local socket. */
function takeHands(
  path: string,
  obey: (text: string, answerTo: (answer: CommandAnswer) => void) => Promise<void>,
): Promise<void> {
  if (process.platform !== 'win32') fs.rmSync(path, { force: true });
  const server = net.createServer((socket) => {
    const tell = (answer: CommandAnswer) => void socket.write(`${JSON.stringify(answer)}\n`);
    createInterface({ input: socket }).on('line', (text) => void obey(text, tell));
    socket.on('error', () => socket.destroy());
  });
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(path, () => resolve());
  });
}

/** A simulated rig without its parent would hold its port for ever. */
function endWithParent(leave: () => never): void {
  const parent = process.ppid;
  setInterval(() => {
    if (process.ppid !== parent) leave();
  }, PARENT_CHECK_MS);
  const input = fs.fstatSync(0);
  if (input.isFIFO() || input.isSocket()) process.stdin.on('end', leave);
  // Ctrl-C reaches the whole group: a board must stay until the loop has made it quiet. Started by
  // hand it is the only one that hears it.
  process.on('SIGINT', process.stdin.isTTY ? leave : () => {});
  process.on('SIGTERM', leave);
  process.stdout.on('error', leave);
}

await main();
