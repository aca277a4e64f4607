/** The bench's figures, less of each: what must hold on any machine, since it is the program's own. */
import { expect, test } from 'vitest';
import {
  measureCounts,
  measureEdgeToOutput,
  measureInterruptsOff,
  measureStack,
  measureWatchdog,
  measureWidths,
} from '../bench/firmware.js';

/** From a pin to the program, at most: DS40002061, "Reading the Pin Value"; not emulated. */
const SYNCHRONISER_US = 1.5 / 16;

test.each([
  [5_021, 1_500],
  [20_011, 4_000],
  [50_021, 10_000],
  [80_021, 12_000],
])('no count is lost at %i edges a second, with the line busy', async (rate, edges) => {
  const counted = await measureCounts('atmega328p', rate, edges);
  expect(counted).toMatchObject({ lost: 0, illegal: 0, overruns: 0 });
});

test('an armed output rises within 10 us of its edge, at 20,000 edges a second', async () => {
  const shots = await measureEdgeToOutput('atmega328p', 20_011, 60);
  expect(shots.missed).toBe(0);
  expect(shots.maxUs + SYNCHRONISER_US).toBeLessThan(10);
});

test.each(['atmega328p', 'atmega2560'] as const)(
  'on the %s a pulse is as wide as asked for, within 20 us, however outputs end together',
  async (board) => {
    const { pulses, least, most } = await measureWidths(board, [0, 1, 3, 9]);
    expect(pulses).toBeGreaterThan(140);
    expect(least).toBeGreaterThan(-1);
    expect(most).toBeLessThan(20);
  },
);

test.each(['atmega328p', 'atmega2560'] as const)(
  'on the %s interrupts are never off for 100 cycles',
  async (board) => {
    const { cycles, hits, edges } = await measureInterruptsOff(board, 400);
    expect(hits).toBeGreaterThan(50);
    expect(edges).toBeGreaterThan(5);
    expect(cycles).toBeLessThan(100);
  },
);

test('a pulse is cut 250 ms after the last finished stamp, and at most 2 ms later', async () => {
  const us = await measureWatchdog('atmega328p');
  expect(us).toBeGreaterThanOrEqual(250_000);
  expect(us).toBeLessThan(252_000);
});

test('the stack never meets the variables', async () => {
  expect(await measureStack('atmega328p')).toBeGreaterThan(24);
});
