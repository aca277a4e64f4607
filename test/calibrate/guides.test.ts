import { existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { runGuide } from '../../server/calibrate/guides/runGuide.js';
import { useCalibration } from '../../server/calibrate/store.js';
import { packageRoot } from '../../server/packageRoot.js';
import { readCalibration } from '../../server/session/rig/calibration.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { VirtualDesk } from './virtualDesk.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-guides-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));
const rigPath = join(folder, 'rig.yaml');
const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');
writeFileSync(rigPath, demo);
const rig = readRig(rigPath);

const SIMULATED = {
  valve: { deadUs: 9_000, usPerUl: 11_000 },
  belt: { countsPerCm: 24.8, slipPerLapCm: 0, slipSpreadCm: 0.05 },
  loopback: { output: 4, input: 4 },
};

describe('the guide for a belt', () => {
  it('finds counts, direction, width of the mark and offset of the simulated belt', async () => {
    const desk = new VirtualDesk(rig, SIMULATED, { laps: 6 });
    const { draft, kept } = await runGuide(desk, 'belt', '');
    const { values, uncertainty } = draft;
    expect(draft.values.lapCounts).toBeCloseTo(24.8 * 180, -1.5);
    const countsPerCm = Number(values.countsPerCm);
    expect(Math.abs(countsPerCm - 24.8)).toBeLessThan(3 * uncertainty.countsPerCm!);
    expect(values.direction).toBe('forward');
    // The simulated mark is 1 cm wide, lies at 0 cm, and its encoder has no play.
    expect(Number(values.markWidthMm)).toBeCloseTo(10, 0);
    expect(Math.abs(Number(values.offsetCm))).toBeLessThan(0.5);
    expect(Math.abs(Number(values.backlashMm))).toBeLessThan(1);
    expect(draft.pictures[0]).toMatchObject({ draw: 'laps' });
    expect(kept?.name).toMatch(/^belt-2026-11-30/);
    // Progress is told all along.
    const done = desk.views.flatMap((view) => (view.done === null ? [] : [view.done]));
    expect(new Set(done.map((share) => share.toFixed(2))).size).toBeGreaterThan(4);
  });

  it('knows a reversed encoder, and tells how far the rig file is off', async () => {
    const belt = { ...SIMULATED.belt, countsPerCm: -24 };
    const desk = new VirtualDesk(rig, { ...SIMULATED, belt }, { laps: 4, offset: 'keep it' });
    const { draft } = await runGuide(desk, 'belt', '');
    expect(draft.values).toMatchObject({ direction: 'reversed', offsetCm: 0 });
    expect(draft.uncertainty.offsetCm).toBeUndefined();
    expect(draft.warnings.join()).toContain('25.000 counts a cm: -4');
  });

  it('shows a lap whose mark was missed, and leaves it out', async () => {
    const desk = new VirtualDesk(
      rig,
      { ...SIMULATED, seed: 5, belt: { ...SIMULATED.belt, markMissChance: 0.15 } },
      { laps: 10, offset: 'keep it' },
    );
    const { draft } = await runGuide(desk, 'belt', '');
    expect(draft.warnings.join()).toMatch(/of \d+ laps lie out/);
    expect(Number(draft.values.lapCounts)).toBeCloseTo(24.8 * 180, -1.5);
  });
});

describe('the guide for a valve', () => {
  const given = { drops: 30, times: '20 60 100 140' };

  it('finds the line of the simulated valve by weighing, into a vial and not into the animal', async () => {
    const desk = new VirtualDesk(rig, SIMULATED, given);
    const { draft } = await runGuide(desk, 'valve', 'valve');
    const { values, uncertainty } = draft;
    expect(Math.abs(Number(values.deadUs) - 9_000)).toBeLessThan(4 * uncertainty.deadUs! + 400);
    expect(Number(values.usPerNl)).toBeCloseTo(11, 0);
    expect(desk.simulated.rises[0]).toBe(120);
    expect(desk.simulated.animal.drunkUl + desk.simulated.animal.atSpoutUl).toBe(0);
    // A microlitre beyond either end was never measured.
    expect(Number(values.leastNl)).toBeGreaterThan(800);
    expect(Number(values.mostNl)).toBeLessThan(12_500);
    expect(draft.pictures).toHaveLength(1);
  });

  it('says that an animal was given more than the calibration in force says', async () => {
    const leaky = { ...SIMULATED, valve: { deadUs: 8_000, usPerUl: 9_000 } };
    const { draft } = await runGuide(new VirtualDesk(rig, leaky, given), 'valve', 'valve');
    expect(draft.warnings.join()).toContain('off what the calibration in force says');
  });

  it('refuses open times that the rig file does not allow', async () => {
    const times = '20 60 900';
    const desk = new VirtualDesk(rig, SIMULATED, { ...given, times });
    await expect(runGuide(desk, 'valve', 'valve')).rejects.toThrow('expected ms up to 250');
    expect(desk.simulated.rises[0]).toBe(0);
  });

  it('ends with the reason when the board stops answering, and keeps nothing', async () => {
    const desk = new VirtualDesk(rig, SIMULATED, given);
    desk.onAsk = ({ go }) => {
      desk.cut = go === 'It is there';
    };
    await expect(runGuide(desk, 'valve', 'valve')).rejects.toThrow('The board did not do it');
  });

  it('once a week checks one point: good as measured, an alarm beyond 10 %', async () => {
    const right = { ...SIMULATED, valve: { deadUs: 8_000, usPerUl: 12_000 } };
    const good = await runGuide(new VirtualDesk(rig, right), 'valve check', 'valve');
    expect(good.draft.values.verdict).toBe('good');
    expect(good.kept?.name).toMatch(/^valve-check-2026-11-30/);
    const worn = { ...SIMULATED, valve: { deadUs: 8_000, usPerUl: 10_000 } };
    const alarm = await runGuide(new VirtualDesk(rig, worn), 'valve check', 'valve');
    expect(alarm.draft.values.verdict).toBe('alarm');
    expect(alarm.draft.warnings.join()).toContain('before the next animal');
  });
});

describe('the guide for the lick sensor', () => {
  it('proposes a lockout beyond the bounces of the simulated sensor, with its reason', async () => {
    const bouncing = { ...SIMULATED, lickBounces: 3 };
    const desk = new VirtualDesk(rig, bouncing, { contacts: 300 });
    const { draft } = await runGuide(desk, 'lick', '');
    expect(Number(draft.values.lockoutUs)).toBeGreaterThan(2_000);
    expect(Number(draft.values.lockoutUs)).toBeLessThan(100_000);
    expect(draft.says[0]).toContain('bounces end within');
    expect(draft.pictures).toHaveLength(2);
  });

  it('tries an output with nobody at the spout, and counts its echoes', async () => {
    const wired = { ...SIMULATED, loopback: { output: 1, input: 0 } };
    const desk = new VirtualDesk(rig, wired, { contacts: 60, echo: 'laser' });
    const { draft } = await runGuide(desk, 'lick', '');
    expect(desk.simulated.rises[1]).toBe(20);
    expect(draft.warnings.join()).toContain('laser echoes in the sensor');
    const clean = new VirtualDesk(rig, SIMULATED, { contacts: 60, echo: 'laser' });
    expect((await runGuide(clean, 'lick', '')).draft.warnings).toEqual([]);
  });
});

describe('the guide for latency', () => {
  it('measures the loopback wire in board time, microseconds', async () => {
    const desk = new VirtualDesk(rig, SIMULATED, { pulses: 40, seconds: 3 });
    const { draft } = await runGuide(desk, 'latency', '');
    // The simulated wire takes 3 us.
    expect(draft.values).toMatchObject({ outputMedianUs: 3, outputMostUs: 3 });
    expect(desk.simulated.rises[4]).toBe(40);
    expect(draft.pictures).toHaveLength(3);
  });

  it('without a wire says that output latency is not known', async () => {
    const { loopback: _, ...unwired } = SIMULATED;
    const desk = new VirtualDesk(rig, unwired, { pulses: 20, seconds: 2 });
    const { draft } = await runGuide(desk, 'latency', '');
    expect(draft.says.join()).toContain('not known');
  });
});

describe('what a guide keeps', () => {
  it('is in force once the rig file refers to it, comments and all else as they were', async () => {
    const own = mkdtempSync(join(folder, 'own-'));
    const path = join(own, 'rig.yaml');
    writeFileSync(path, demo);
    const before = readRig(path);
    const desk = new VirtualDesk(before, SIMULATED, { laps: 4, drops: 20, times: '20 60 120' });
    const belt = await runGuide(desk, 'belt', '');
    const valve = await runGuide(desk, 'valve', 'valve');
    useCalibration(path, belt.kept!);
    useCalibration(path, valve.kept!);
    const after = readRig(path);
    expect(after.belt.countsPerCm).toBe(belt.draft.values.countsPerCm);
    expect(after.outputs[0]!.valve).toMatchObject({ deadUs: valve.draft.values.deadUs });
    const text = readFileSync(path, 'utf8');
    expect(text).toContain('# The rig of the demo');
    expect(text).toContain('calibration: valve-2026-11-30');
    expect(text).not.toContain('counts_per_cm');
    expect(existsSync(`${path}.bak`)).toBe(true);
    expect(readCalibration(before.calibrationsFolder, 'belt-2026-11-30').values).toEqual(
      belt.draft.values,
    );
  });

  it('is nothing when the person throws it away', async () => {
    const own = mkdtempSync(join(folder, 'own-'));
    const path = join(own, 'rig.yaml');
    writeFileSync(path, demo);
    const desk = new VirtualDesk(readRig(path), SIMULATED, {
      ...{ pulses: 20, seconds: 2, keep: 'throw it away' },
    });
    expect((await runGuide(desk, 'latency', '')).kept).toBeUndefined();
    expect(existsSync(join(own, 'calibrations'))).toBe(false);
  });
});
