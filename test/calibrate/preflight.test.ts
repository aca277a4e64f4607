import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { afterAll, describe, expect, it } from 'vitest';
import type { Facts } from '../../server/calibrate/preflight/checks.js';
import {
  type Computer,
  clockIsSane,
  diskHasRoom,
  willNotSleep,
} from '../../server/calibrate/preflight/computer.js';
import { factsOf, runPreflight } from '../../server/calibrate/preflight/preflight.js';
import { packageRoot } from '../../server/packageRoot.js';
import { readDescription, sessionSchemaFile } from '../../server/session/description.js';
import { latestPreflight, preflightFolder } from '../../server/session/preflight.js';
import { prepareRules } from '../../server/session/prepare.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { openSession } from '../../server/session/store.js';
import { VirtualDesk } from './virtualDesk.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-preflight-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));
const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');

function ownRig(change: (text: string) => string = (text) => text) {
  const path = join(mkdtempSync(join(folder, 'rig-')), 'rig.yaml');
  writeFileSync(path, change(demo));
  return readRig(path);
}

function computer(more: Partial<Computer> = {}): Computer {
  return {
    platform: 'linux',
    now: () => new Date('2026-12-01T09:00:00Z'),
    read: () => undefined,
    run: async () => undefined,
    ...more,
  };
}
const facts: Facts = {
  ...{ computer: computer(), freeBytes: 50e9, largestBytes: 60e6, newest: undefined },
};
const SIMULATED = {
  belt: { countsPerCm: 25, slipPerLapCm: 0, slipSpreadCm: 0 },
  valve: { deadUs: 8_000, usPerUl: 12_000 },
  loopback: { output: 4, input: 4 },
};

describe('the pre-flight', () => {
  it('finds nothing wrong with a rig that works, and says what it could not look at', async () => {
    const rig = ownRig();
    const desk = new VirtualDesk(rig, SIMULATED);
    const preflight = await runPreflight(desk, facts);
    const results = Object.fromEntries(preflight.checks.map(({ id, result }) => [id, result]));
    expect(results).toEqual({
      ...{ board: 'passed', disk: 'passed', sleep: 'passed', clock: 'passed', loopback: 'passed' },
      ...{ lap: 'passed', spout: 'passed', inputs: 'passed', drops: 'passed' },
      calibrations: 'not possible',
    });
    expect(preflight.passed).toBe(true);
    expect(desk.simulated.rises.slice(0, 5)).toEqual([5, 0, 0, 0, 5]);
  });

  it('tells what fails and what to do, and overrides nothing without a reason', async () => {
    const desk = new VirtualDesk(
      ownRig(),
      { ...SIMULATED, belt: { ...SIMULATED.belt, mark: false } },
      { lap: 'go on all the same', 'lap-reason': '  ' },
    );
    let times = 0;
    desk.onAsk = ({ fields }) => {
      if (fields.some(({ name }) => name === 'lap')) times++;
      if (times === 2) Object.assign(desk.given, { 'lap-reason': 'the mark is being replaced' });
    };
    const preflight = await runPreflight(desk, facts);
    expect(times).toBe(2);
    const lap = preflight.checks.find(({ id }) => id === 'lap')!;
    expect(lap).toMatchObject({
      result: 'overridden',
      reason: 'the mark is being replaced',
      detail: 'The mark was seen not at all.',
    });
    expect(lap.remedy).toContain('the sensor');
    expect(preflight.passed).toBe(true);
  });

  it('has not passed while something is left failed', async () => {
    const { loopback: _, ...unwired } = SIMULATED;
    const preflight = await runPreflight(new VirtualDesk(ownRig(), unwired), facts);
    expect(preflight.passed).toBe(false);
    expect(preflight.checks.find(({ id }) => id === 'loopback')).toMatchObject({
      ...{ result: 'failed', detail: '0 of 5 pulses of marker seen at echo.' },
    });
  });

  it('knows a belt that turns the other way than the rig file says', async () => {
    const rig = ownRig((text) => text.replace('direction: forward', 'direction: reversed'));
    const { checks } = await runPreflight(new VirtualDesk(rig, SIMULATED), facts);
    expect(checks.find(({ id }) => id === 'lap')?.detail).toContain('the other way');
  });

  it('is for the board that the rig file names', async () => {
    const rig = ownRig((text) => text.replace('port: simulated', 'port: simulated\n  board_id: 7'));
    const { checks } = await runPreflight(new VirtualDesk(rig, SIMULATED), facts);
    expect(checks[0]).toMatchObject({ id: 'board', result: 'failed' });
    expect(checks[0]!.detail).toContain('the rig file is for board 7');
  });

  it('is kept, and copied into the description of the session that follows within twelve hours', async () => {
    const rig = ownRig();
    const preflight = await runPreflight(new VirtualDesk(rig, SIMULATED), facts);
    const madeMs = Date.parse(preflight.madeAt);
    const later = (hours: number) => new Date(madeMs + hours * 3_600_000);
    expect(latestPreflight(rig, later(1))).toEqual(preflight);
    expect(latestPreflight(rig, later(13))).toBeUndefined();
    expect(latestPreflight(rig, later(-1))).toBeUndefined();
    // What is no pre-flight is passed over.
    writeFileSync(join(preflightFolder(rig), '2026-11-30_23-59-59.json'), '{"format": 1');
    const rules = join(folder, 'rules.yaml');
    writeFileSync(
      rules,
      'title: t\nbelt: 180 cm\nrules:\n  w:\n    when: reaches 9 cm\n    do: give 4 uL\n',
    );
    const root = join(folder, 'records');
    mkdirSync(root, { recursive: true });
    const card = { subject: 's', experimenter: '', seed: 'x', waterTodayNl: 0 };
    const opened = openSession(
      root,
      rig,
      prepareRules(rules, rig),
      { ...card, startedAt: later(2) },
      null,
      {},
    );
    opened.recorder.close('done');
    const description = readDescription(opened.folder);
    expect(description.preflight).toEqual(preflight);
    const validate = new Ajv2020({ strict: false, validateFormats: false }).compile(
      JSON.parse(readFileSync(sessionSchemaFile(), 'utf8')),
    );
    expect(validate(description), JSON.stringify(validate.errors)).toBe(true);
  });

  it('asks this computer itself without falling over', () => {
    const own = factsOf(ownRig());
    expect(own.freeBytes).toBeGreaterThan(0);
    expect(own.newest).toBeUndefined();
  });
});

describe('the checks of the computer', () => {
  it('on Linux know masked sleep, a program that holds it off, and neither', async () => {
    const states = { read: () => 'freeze mem disk\n' };
    const says = (enabled: string, list: string) =>
      computer({
        ...states,
        run: async (command) => (command === 'systemctl' ? enabled : list),
      });
    expect((await willNotSleep(says('masked\nmasked\n', ''))).result).toBe('passed');
    const held = 'Lapwing 0 root 1 lapwing sleep:idle a session block\n';
    expect((await willNotSleep(says('static\nstatic\n', held))).result).toBe('passed');
    const delayed = 'NetworkManager 0 root 1 nm sleep needs to close delay\n';
    const found = await willNotSleep(says('static\nstatic\n', delayed));
    expect(found).toMatchObject({ result: 'failed' });
    expect(found.remedy).toContain('systemd-inhibit');
    expect((await willNotSleep(computer(states))).result).toBe('not possible');
    expect((await willNotSleep(computer())).result).toBe('passed');
  });

  it('elsewhere say what to look at', async () => {
    for (const platform of ['darwin', 'win32', 'freebsd'] as const) {
      const found = await willNotSleep(computer({ platform }));
      expect(found.result).toBe('not possible');
      expect(found.remedy).not.toBe('');
    }
  });

  it('refuse a clock that was never set, that went back, or that nobody keeps', async () => {
    const at = (time: string) => computer({ now: () => new Date(time) });
    expect((await clockIsSane(at('1970-01-01T00:00:10Z'), undefined)).result).toBe('failed');
    const newest = new Date('2026-12-01T10:00:00Z');
    expect((await clockIsSane(at('2026-12-01T09:00:00Z'), newest)).detail).toContain('was made at');
    expect((await clockIsSane(at('2026-12-01T11:00:00Z'), newest)).result).toBe('passed');
    const free = computer({ run: async () => 'no\n' });
    expect((await clockIsSane(free, undefined)).result).toBe('failed');
    expect((await clockIsSane(computer({ run: async () => 'yes\n' }), undefined)).result).toBe(
      'passed',
    );
  });

  it('want room for two sessions like the largest', () => {
    expect(diskHasRoom(500e6, 100e6).result).toBe('passed');
    expect(diskHasRoom(399e6, 0).result).toBe('failed');
    expect(diskHasRoom(5e9, 3e9)).toMatchObject({ result: 'failed' });
  });
});
