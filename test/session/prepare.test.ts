import { mkdirSync, symlinkSync, truncateSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { readDescription } from '../../server/session/description.js';
import { prepareRules, readRules } from '../../server/session/prepare.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { openSession } from '../../server/session/store.js';
import { demoRig, scratchFolder } from './rehearsed.js';

const { folder, remove } = scratchFolder();
afterAll(remove);

const RULES = `title: with places
belt: 180 cm
include: shared/places.yaml
rules:
  water:
    when: reaches spot
    do: give 4 uL
end: time >= 60 min
`;

describe('a rules file on disk', () => {
  it('is read with what it includes', () => {
    mkdirSync(join(folder, 'shared'));
    writeFileSync(join(folder, 'shared/places.yaml'), 'places:\n  spot: 90 cm\n');
    const path = join(folder, 'rules.yaml');
    writeFileSync(path, RULES);
    const { file, program } = prepareRules(path, demoRig);
    expect(file.sources).toHaveLength(2);
    expect(program.rules).toHaveLength(1);
  });

  it('may not include what a link leads to outside its folder', () => {
    mkdirSync(join(folder, 'inner/shared'), { recursive: true });
    symlinkSync(join(folder, 'shared/places.yaml'), join(folder, 'inner/shared/places.yaml'));
    const path = join(folder, 'inner/rules.yaml');
    writeFileSync(path, RULES);
    const { file, problems } = readRules(path, demoRig);
    expect(file).toBeUndefined();
    expect(problems.map(({ message }) => message).join()).toMatch(/link that leads out/);
  });

  it('is not read at all when it is larger than any rules file', () => {
    const path = join(folder, 'huge.yaml');
    writeFileSync(path, 'title: huge\n');
    truncateSync(path, 1 << 30);
    const { problems } = readRules(path, demoRig);
    expect(problems.map(({ message }) => message).join()).toMatch(/larger than 4 MiB/);
  });

  it('with a mistake is refused with its place', () => {
    const path = join(folder, 'wrong.yaml');
    writeFileSync(path, RULES.replace('give 4 uL', 'give 4 cm'));
    expect(() => prepareRules(path, demoRig)).toThrow(/wrong\.yaml:7:/);
  });
});

describe('a session folder', () => {
  it('holds the rules with everything that they bring in, and can be run as it stands', () => {
    const sessions = join(packageRoot, 'hardware-sim/demo/sessions');
    const rules = prepareRules(join(sessions, '11-yoked-control.yaml'), demoRig);
    const numbers = { protocolNumber: 'P-2026-014', sessionNumber: 3 };
    const who = { subject: 'm1', experimenter: '', ...numbers };
    const card = { ...who, seed: 's', startedAt: new Date(0) };
    const opened = openSession(folder, demoRig, rules, { ...card, waterTodayNl: 0 }, null, {
      mode: 'bulk',
    });
    opened.recorder.close('done');
    const { files, ...described } = readDescription(opened.folder);
    expect(described).toMatchObject(numbers);
    expect(files.map(({ role, stored }) => `${role} ${stored}`)).toEqual([
      'rig rig.yaml',
      'rules rules.yaml',
      'included m12-earned.csv',
    ]);
    const rig = readRig(join(opened.folder, 'rig.yaml'));
    const again = prepareRules(join(opened.folder, 'rules.yaml'), rig);
    expect(again.file.tables[0]!.rows).toEqual(rules.file.tables[0]!.rows);
  });
});
