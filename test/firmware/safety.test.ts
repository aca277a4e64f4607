/** What keeps an output from staying on when something else has failed, on the emulated firmware. */
import { beforeEach, expect, test } from 'vitest';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine } from '../../hardware-sim/conformance/lines.js';
import { EmulatedBoard } from '../../hardware-sim/emulator/emulatedBoard.js';
import { RESET_CAUSE } from '../../server/wire/messages.js';

const TIMSK1 = 0x6f;
const RJMP_SELF = 0xcfff;

let line: ReturnType<typeof emulatedLine>;
let host: ConformanceHost;
beforeEach(async () => {
  line = emulatedLine();
  host = new ConformanceHost(line);
  await host.connect();
});

test('outputs are low and driven from the beginning, and never pulse on the way', () => {
  const board = new EmulatedBoard({ seed: 9 });
  const changes: number[] = [];
  board.probe = (output) => changes.push(output);
  expect(board.outputsDriven).toBe(0);
  board.advanceTo(60_000);
  expect(board.outputsDriven).toBe(0b111111);
  expect(board.outputLevels).toBe(0);
  expect(changes).toEqual([]);
});

test('a reset in the middle of a pulse lets go of the pins, and the board is another boot', async () => {
  const { board } = line;
  host.pulse({ widthUs: 500_000 });
  await host.live(10_000);
  expect(board.outputLevels).toBe(1);
  const { bootId, boardId } = host.identity;
  board.reset();
  expect(board.outputsDriven).toBe(0);
  await host.silent(60_000);
  expect(board.outputLevels).toBe(0);
  expect(host.identity).toMatchObject({
    ...{ nonce: 0, tag: 0, previousTag: 0, outcomesKept: 0, boardId },
    resetCause: RESET_CAUSE.resetPin,
  });
  expect(host.identity.bootId).not.toBe(bootId);
});

test('the tick cuts an output off by itself when the timer no longer ends pulses', async () => {
  const { board } = line;
  host.configure({ longestOnUs: 20_000 });
  const id = host.pulse({ widthUs: 20_000 });
  await host.silent(5_000);
  expect(board.outputLevels).toBe(1);
  const fromUs = board.worldUs;
  // The compare interrupt is gone: what a wrong write to one register would do.
  board.chip.cpu.writeData(TIMSK1, board.chip.cpu.data[TIMSK1]! & ~4);
  let fellUs = Number.NaN;
  board.probe = () => {
    fellUs = board.worldUs;
  };
  await host.silent(60_000);
  expect(fellUs - fromUs).toBeLessThan(25_000);
  expect(board.outputLevels).toBe(0);
  host.expectTold(id, 'fired, done longestOn');
});

test("a program that hangs is reset by the chip's watchdog within 70 ms", async () => {
  const { board } = line;
  host.pulse({ widthUs: 900_000 });
  await host.live(10_000);
  expect(board.outputLevels).toBe(1);
  const { cpu } = board.chip;
  while (board.chip.sleeping) board.runToCycle(board.cycle + 1);
  cpu.data[0x5f]! &= 0x7f;
  const kept = cpu.progMem[cpu.pc]!;
  const at = cpu.pc;
  cpu.progMem[at] = RJMP_SELF;
  let reset = false;
  board.chip.resetItself = () => {
    reset = true;
    cpu.progMem[at] = kept;
  };
  await host.silent(70_000);
  expect(reset).toBe(true);
  expect(board.outputLevels).toBe(0);
  await host.silent(60_000);
  expect(host.identity.resetCause).toBe(RESET_CAUSE.chipWatchdog);
});

test('the monostable is fed while beats are fresh, and not 150 ms after the last', async () => {
  const { board } = line;
  await host.live(20_000);
  const fed = board.aliveChanges;
  await host.live(50_000);
  expect(board.aliveChanges - fed).toBeGreaterThan(45);
  await host.silent(160_000);
  const last = board.aliveChanges;
  await host.silent(50_000);
  expect(board.aliveChanges).toBe(last);
});

test('an input that chatters without end takes neither the chip nor the line', async () => {
  const { board } = line;
  const id = host.arm({ count: host.count + 40, widthUs: 2_000 });
  for (let n = 0; n < 20_000; n++) {
    board.setInput(0, n % 2 === 0 ? 1 : 0);
    board.runToCycle(board.cycle + 160);
    if (n % 400 === 0) host.beat();
    if (n % 400 === 200) board.step(1);
  }
  host.expectTold(id, 'fired, done');
  host.expectFaults('');
  expect(host.identities).toHaveLength(1);
  const gapsUs = host.samples.slice(1).map((one, n) => one.boardUs - host.samples[n]!.boardUs);
  expect(Math.max(...gapsUs)).toBeLessThan(20_000);
  await host.live(20_000);
  expect(host.last(host.samples, 'sample')).toMatchObject({ inputs: 0, badFrames: 0, overruns: 0 });
});
