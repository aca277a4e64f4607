/** `lapwing selftest` as a user runs it, on the firmware, over a pseudo-terminal, in real time. */
import { afterAll, beforeAll, expect, test } from 'vitest';
import { SCRIPTS } from '../../hardware-sim/conformance/scripts.js';
import type { EmulatedRigBoard } from '../../hardware-sim/emulator/emulatedRigBoard.js';
import { PacedRig } from '../../hardware-sim/realTime/pacedRig.js';
import { PtyLine } from '../../hardware-sim/realTime/ptyLine.js';
import { finished, lapwing } from '../tools/liveRig.js';

const [OUTPUT, INPUT] = [3, 2];
let paced: PacedRig;
let port: string;

beforeAll(async () => {
  paced = new PacedRig({ seed: 6 }, true);
  paced.rig.forcedCmPerS = 0;
  const { board } = paced.rig.board as EmulatedRigBoard;
  const { probe } = board;
  // A wire between two pins: what is high at the one is high, so inactive, at the other.
  board.setInput(INPUT, 1);
  board.probe = (output, level, cycle) => {
    probe(output, level, cycle);
    if (output === OUTPUT) board.setInput(INPUT, level === 1 ? 0 : 1);
  };
  const line = await PtyLine.create((bytes) => paced.heard(bytes));
  paced.line = line;
  port = line.port;
  paced.start();
});

afterAll(() => {
  paced.stop();
  paced.line?.unplug();
});

test('the self test finds that the firmware conforms, and measures an output by a wire to an input', async () => {
  const wire = ['--loopback', `${OUTPUT}:${INPUT}`, '--drift', '1'];
  const { status, out, err } = await finished(
    lapwing('selftest', port, '--outputs-free', '--json', ...wire),
  );
  expect(status, `${out}${err}`).toBe(0);
  const report = JSON.parse(out);
  expect(report.board).toMatchObject({
    model: 'ATmega328P 16MHz',
    outputs: 6,
    inputs: 5,
    slots: 8,
  });
  expect(report.conforms).toBe(true);
  expect(report.scripts.map(({ name }: { name: string }) => name)).toEqual(
    SCRIPTS.map(({ name }) => name),
  );
  // Over a port nothing can turn the encoder or see a pin: those scripts say so.
  for (const { name, result, why } of report.scripts) {
    const { needs = [] } = SCRIPTS.find((script) => script.name === name)!;
    expect({ name, result, why }).toMatchObject({
      result: needs.length > 0 ? 'not possible here' : 'conforms',
    });
  }
  expect(report.roundTrip.asked).toBe(200);
  expect(report.loopback).toMatchObject({ pulses: 50 });
  expect(report.loopback.seen).toBeGreaterThan(40);
  // Both stamps are the board's own: how busy this computer is does not matter.
  expect(report.loopback.mostUs).toBeLessThan(60);
}, 240_000);

test('it does not make outputs pulse that something may be wired to', async () => {
  const { status, err } = await finished(lapwing('selftest', port));
  expect(status).not.toBe(0);
  expect(err).toContain('SELFTEST_OUTPUTS');
});
