/** A whole session on the real firmware, as a user runs one: processes, a pseudo-terminal, a record. */
import { mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, expect, test } from 'vitest';
import { rigFile } from '../../server/main/builtInRigs.js';
import { packageRoot } from '../../server/packageRoot.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { Summariser, summaryLines } from '../../server/session/summary.js';
import { finished, lapwing } from '../tools/liveRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-emulated-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const RULES = `
title: Light, both, water
belt: 180 cm
rules:
  light:
    when: reaches 8 cm
    do: pulse laser for 20 ms
    within: 5 mm
  both:
    when: reaches 14 cm
    do:
      - pulse laser for 20 ms
      - pulse tone for 20 ms
  water:
    when: reaches 20 cm
    do: give 4 uL
  past:
    when: reaches 25 cm
    if: lap is 2
    do: end session
end: time >= 5 min
`;

test('`lapwing run --rig emulated` fires armed triggers, gives water, ends, and tells how near', async () => {
  const rules = join(folder, 'rules.yaml');
  const records = join(folder, 'records');
  writeFileSync(rules, RULES);
  const folders = ['--records', records, '--animals', join(folder, 'animals')];
  const { status, out, err } = await finished(
    lapwing('run', rules, '--rig', 'emulated', ...folders),
  );
  expect(status, `${out}${err}`).toBe(0);
  const decisions: StampedDecision[] = [];
  const session = join(records, readdirSync(records)[0]!);
  (await readRecord(session)).visit({ decision: (one) => decisions.push(one) });
  const summariser = new Summariser(['light', 'both', 'water']);
  for (const decision of decisions) summariser.take(decision);
  const { summary } = summariser;
  const told = summaryLines(summary).join('\n');
  const [light, both, water] = ['light', 'both', 'water'].map((name) => summary.rules.get(name)!);

  // On a machine that stands still too long the board ends its slots: not on each of two laps.
  expect(light!.armedErrorsMm.length, told).toBeGreaterThan(0);
  // 25 counts to a cm: within one of them.
  for (const errorMm of light!.armedErrorsMm)
    expect(Math.abs(errorMm)).toBeLessThanOrEqual(0.4 + 1e-6);
  expect(both!.armedErrorsMm).toEqual([]);
  expect(both!.hostErrorsMm.length, told).toBeGreaterThan(0);
  expect(water!.fired).toBeGreaterThan(0);
  expect(summary.waterNl).toBeGreaterThan(3_800 * water!.fired);
  expect(summary.waterNl).toBeLessThan(4_200 * water!.fired);
  expect(told).toMatch(/light: fired \d; \d started by the board, 0\.\d\d mm/);
  expect(told).toMatch(/both: fired \d; \d by the host, \d/);
}, 240_000);

test('the emulated rig is the demo rig on another board', () => {
  const wired = (name: string) => {
    const { belt, inputs, outputs, lick, water, sync, loopback } = readRig(rigFile(name));
    return { belt, inputs, outputs, lick, water, sync, loopback };
  };
  expect(readRig(rigFile('emulated')).port).toBe('emulated');
  expect(wired('emulated')).toEqual(wired('simulated'));
});

test('a rig that comes along yields to a file of its name', () => {
  expect(rigFile('emulated')).toBe(join(packageRoot, 'hardware-sim/demo/emulated.yaml'));
  expect(rigFile('my-rig.yaml')).toBe('my-rig.yaml');
  const own = join(folder, 'emulated');
  writeFileSync(own, '');
  expect(rigFile(own)).toBe(own);
});
