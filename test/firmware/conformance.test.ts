/**
 * One suite for every board that speaks the wire: the simulated one, the firmware on each chip under
 * emulation, and, by `lapwing selftest PORT`, a real one.
 */
import { afterAll, describe, expect, test } from 'vitest';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine, simulatedLine } from '../../hardware-sim/conformance/lines.js';
import { runScript } from '../../hardware-sim/conformance/run.js';
import { SCRIPTS } from '../../hardware-sim/conformance/scripts.js';

const LINES = [simulatedLine(), emulatedLine(), emulatedLine({ board: 'atmega2560', seed: 2 })];

describe.each(LINES.map((line) => [line.name, line] as const))('%s', (_name, line) => {
  const host = new ConformanceHost(line);

  test.each(SCRIPTS.map((script) => [script.name, script] as const))('%s', async (_, script) => {
    const { result, why } = await runScript(host, script);
    expect({ result, why }).toEqual({ result: 'conforms', why: undefined });
  });

  afterAll(() => {
    expect(host.badFrames).toBe(0);
  });
});
