/** What `lapwing selftest` measures, on the emulated firmware, where the truth is known. */
import { existsSync } from 'node:fs';
import { expect, test } from 'vitest';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine } from '../../hardware-sim/conformance/lines.js';
import {
  measureDrift,
  measureLoopback,
  measureRoundTrip,
} from '../../hardware-sim/conformance/measures.js';
import { FLASHABLE, type FlashableBoard, flashArguments } from '../../server/main/flash.js';

function bench() {
  const line = emulatedLine();
  return { line, host: new ConformanceHost(line), clock: () => line.board.worldUs };
}

test('a round trip takes the two frames on the line and little more', async () => {
  const { host, clock } = bench();
  const trip = await measureRoundTrip(host, clock, 30);
  // 41 bytes there and 28 back at 50 bytes a millisecond, a sample in the way now and then.
  expect(trip.medianUs).toBeGreaterThan(1_200);
  expect(trip.mostUs).toBeLessThan(4_000);
});

test('a host clock that is 200 ppm slow makes the board look 200 ppm fast', async () => {
  const { host, clock } = bench();
  expect(await measureDrift(host, () => clock() / 1.0002, 4)).toBeCloseTo(200, -1.5);
});

test('an output that is wired to an input is seen within 20 us of its rise', async () => {
  const { line, host } = bench();
  const { board } = line;
  // The output idles high, the input is active when low: on is active.
  board.probe = (output, level) => {
    if (output === 3) board.setInput(2, level === 0 ? 1 : 0);
  };
  const loop = await measureLoopback(host, 3, 2, 10);
  expect(loop.seen).toBe(10);
  expect(loop.mostUs).toBeLessThanOrEqual(20);
});

test.each(Object.keys(FLASHABLE) as FlashableBoard[])(
  'there is a .hex file to flash: %s',
  (board) => {
    const args = flashArguments(board, '/dev/ttyACM0');
    const [, file] = /^flash:w:(.*):i$/.exec(args.at(-1)!)!;
    expect(existsSync(file!)).toBe(true);
    expect(args).toContain(board);
  },
);
