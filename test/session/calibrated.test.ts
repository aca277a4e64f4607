import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { readDescription } from '../../server/session/description.js';
import { loadSession } from '../../server/session/loadSession.js';
import { prepareRules } from '../../server/session/prepare.js';
import { isOld, listCalibrations } from '../../server/session/rig/calibration.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { openSession } from '../../server/session/store.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-calibrated-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));
const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');
mkdirSync(join(folder, 'calibrations'));

function keep(name: string, kind: string, of: string, values: object, more: object = {}): void {
  const calibration = {
    ...{ format: 1, name, kind, of, rig: 'demo', madeAt: '2026-11-30T09:12:44+01:00', by: 'KL' },
    ...{ board: { model: 'simulated', boardId: 0, simulated: true }, warnAfterDays: 30 },
    ...{ values, uncertainty: {}, method: 'invented for a test', measured: null },
    ...more,
  };
  writeFileSync(join(folder, `calibrations/${name}.json`), JSON.stringify(calibration));
}
keep('belt-2026-11-30', 'belt', 'belt', {
  ...{ lengthCm: 179.4, countsPerCm: 25.08, direction: 'reversed', offsetCm: -12.5 },
});
keep('valve-2026-11-30', 'valve', 'valve', {
  ...{ deadUs: 7_500, usPerNl: 11.2, leastNl: 900, mostNl: 12_400 },
});
keep('lick-2026-11-30', 'lick', 'lick', { lockoutUs: 42_000, stuckUs: 600_000 });

function rigWith(...changes: [string, string][]): string {
  let text = demo;
  for (const [from, to] of changes) {
    expect(text).toContain(from);
    text = text.replace(from, to);
  }
  const path = join(folder, 'rig.yaml');
  writeFileSync(path, text);
  return path;
}
const BELT: [string, string][] = [
  ['  length: 180 cm\n', '  calibration: belt-2026-11-30\n'],
  ['  counts_per_cm: 25\n', ''],
  ['  direction: forward\n', ''],
  ['    offset: 0 cm\n', ''],
];
const LINE = / {4}calibration:\n( {6}.*\n)+/;
const VALVE: [string, string] = [LINE.exec(demo)![0], '    calibration: valve-2026-11-30\n'];
const LICK: [string, string] = ['    lockout: 50 ms\n', '    calibration: lick-2026-11-30\n'];

describe('a rig file that refers to stored calibrations', () => {
  it('has their numbers in place of its own', () => {
    const rig = readRig(rigWith(...BELT, VALVE, LICK));
    expect(rig.belt).toMatchObject({ lengthCm: 179.4, countsPerCm: 25.08, reversed: true });
    expect(rig.belt.seam?.offsetCm).toBe(-12.5);
    expect(rig.outputs[0]!.valve).toEqual({
      ...{ deadUs: 7_500, usPerNl: 11.2, leastNl: 900, mostNl: 12_400 },
    });
    expect(rig.lick).toMatchObject({ lockoutUs: 42_000, stuckUs: 600_000, artefactUs: 5_000 });
    expect(rig.calibrations.map(({ source }) => source)).toContain(
      'calibrations/valve-2026-11-30.json',
    );
  });

  it('goes on with its own where it writes them out', () => {
    const rig = readRig(rigWith());
    expect(rig.outputs[0]!.valve).toMatchObject({ deadUs: 8_000, usPerNl: 12 });
    expect(rig.calibrations).toEqual([]);
  });

  it.each<[string, [string, string][], RegExp]>([
    ['one that is not there', [[VALVE[0], '    calibration: valve-x\n']], /valve-x\.json: ENOENT/],
    [
      "another part's",
      [[VALVE[0], '    calibration: lick-2026-11-30\n']],
      /is a lick of lick: expected a valve of valve/,
    ],
    ['a name that leads elsewhere', [[VALVE[0], '    calibration: ../rig\n']], /found `..\/rig`/],
    [
      'a length beside it',
      [['  length: 180 cm\n', '  length: 180 cm\n  calibration: belt-2026-11-30\n']],
      /rig\.yaml:\d+:3: the calibration says this: leave one of the two out/,
    ],
    ['no length at all', [['  length: 180 cm\n', '']], /missing key `length`/],
    ['a folder elsewhere', [['rig: demo', 'rig: demo\ncalibrations: ../x']], /calibrations/],
  ])('is refused with the place for %s', (_, changes, expected) => {
    const path = rigWith(...changes);
    expect(() => readRig(path)).toThrow(expected);
  });

  it('may say that a valve is still to be measured, and then gives no volume', () => {
    const rig = readRig(rigWith([VALVE[0], '    calibration: none\n']));
    expect(rig.outputs[0]!.valve).toBeUndefined();
    const rules = join(folder, 'rules.yaml');
    writeFileSync(
      rules,
      'title: t\nbelt: 180 cm\nrules:\n  w:\n    when: reaches 9 cm\n    do: give 4 uL\n',
    );
    expect(() => prepareRules(rules, rig)).toThrow('`valve` is not calibrated yet');
  });

  it('lies in the session folder with its calibrations, so that a replay finds the same numbers', () => {
    const path = rigWith(...BELT, VALVE, LICK);
    const rules = join(folder, 'rules.yaml');
    writeFileSync(
      rules,
      'title: t\nbelt: 179.4 cm\nrules:\n  w:\n    when: reaches 9 cm\n    do: give 4 uL\n',
    );
    const rig = readRig(path);
    const card = { subject: 's', experimenter: '', seed: 'x', startedAt: new Date() };
    const prepared = prepareRules(rules, rig);
    const root = join(folder, 'records');
    const opened = openSession(root, rig, prepared, { ...card, waterTodayNl: 0 }, null, {
      mode: 'bulk',
    });
    opened.recorder.close('done');
    const { calibrations } = readDescription(opened.folder);
    expect(calibrations.find(({ of }) => of === 'valve')).toMatchObject({
      ...{ name: 'valve-2026-11-30', madeAt: '2026-11-30T09:12:44+01:00' },
      values: { deadUs: 7_500 },
    });
    // What is in force now may be something else.
    rmSync(join(folder, 'calibrations/belt-2026-11-30.json'));
    const loaded = loadSession(opened.folder);
    expect(loaded.rig.belt).toEqual(rig.belt);
    expect(loaded.rig.outputs).toEqual(rig.outputs);
  });
});

describe('stored calibrations', () => {
  it('are listed with the newest first, and what is none is told apart', () => {
    const later = { madeAt: '2026-12-01T00:00:00Z' };
    keep('valve-2026-12-01', 'valve', 'valve', {}, later);
    writeFileSync(join(folder, 'calibrations/torn.json'), '{"format": 1');
    writeFileSync(join(folder, 'calibrations/other.json'), '{"format": 2}');
    const { calibrations, bad } = listCalibrations(join(folder, 'calibrations'));
    expect(calibrations[0]!.name).toBe('valve-2026-12-01');
    expect(bad.map(({ file }) => file).sort()).toEqual(['other.json', 'torn.json']);
    expect(listCalibrations(join(folder, 'nowhere'))).toEqual({ calibrations: [], bad: [] });
  });

  it('are old after the days that they name', () => {
    const [one] = listCalibrations(join(folder, 'calibrations')).calibrations;
    expect(isOld(one!, new Date('2026-12-30T00:00:00Z'))).toBe(false);
    expect(isOld(one!, new Date('2026-12-31T00:00:01Z'))).toBe(true);
  });
});
