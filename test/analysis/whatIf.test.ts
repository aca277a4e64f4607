import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { afterAll, describe, expect, it } from 'vitest';
import { SimulatedLedBoard } from '../../server/main/ledBoard.js';
import {
  readDescription,
  sessionSchemaFile,
  updateDescription,
} from '../../server/session/description.js';
import { loadSession } from '../../server/session/loadSession.js';
import { finish } from '../../server/session/record/finish.js';
import { noteReplay } from '../../server/session/selfCheck.js';
import { whatIf } from '../../server/session/whatIf.js';
import { recordedSession } from './recorded.js';

const session = recordedSession({ minutes: 8 });
afterAll(() => session.remove());
const rules = readFileSync(join(session.folder, 'rules.yaml'), 'utf8');

/** What these rules would have done in the recorded session. */
async function would(text: string) {
  const file = join(session.root, 'other.yaml');
  writeFileSync(file, text);
  return whatIf(loadSession(session.folder, file), (hear) => new SimulatedLedBoard(hear));
}

describe('other rules on a recorded belt', () => {
  it('say nothing new when they are the same rules', async () => {
    const { rows, counts } = await would(rules);
    expect(rows.length).toBeGreaterThan(10);
    expect(counts).toEqual({
      ...{ same: rows.length, moved: 0, 'other draw': 0 },
      ...{ 'only recorded': 0, 'only with other rules': 0 },
    });
  });

  it('fire at their own place, by as many cm as the two files differ', async () => {
    const { rows, counts } = await would(rules.replace('reaches 90 cm', 'reaches 70 cm'));
    const water = rows.filter(({ rule }) => rule === 'water');
    expect(counts.moved).toBeGreaterThan(5);
    for (const { recorded, other, verdict } of water) {
      if (recorded === null || other === null) continue;
      expect(verdict).toBe('moved');
      expect(recorded.positionCm! - other.positionCm!).toBeGreaterThan(19.5);
      expect(recorded.positionCm! - other.positionCm!).toBeLessThan(20.5);
    }
    const others = rows.filter(({ rule }) => rule === 'induce');
    expect(others.every(({ verdict }) => verdict === 'same')).toBe(true);
  });

  it('tell what they would have left out when they limit it', async () => {
    const limited = rules.replace(
      'do: give drop\n    within',
      'do: give drop\n    limit: 3 per session\n    within',
    );
    const { rows } = await would(limited);
    const water = rows.filter(({ rule }) => rule === 'water');
    expect(water.filter(({ verdict }) => verdict === 'same')).toHaveLength(3);
    expect(water.filter(({ verdict }) => verdict === 'only recorded').length).toBeGreaterThan(2);
  });

  it('tell why something would not have fired', async () => {
    const first =
      '  early:\n    when: reaches 89.9 cm\n    do: give drop\n    within: 1 cm\n  treat:';
    const { rows } = await would(rules.replace('  treat:', first));
    expect(rows.some(({ rule }) => rule === 'early')).toBe(true);
    const left = rows.filter(
      ({ rule, verdict }) => rule === 'water' && verdict === 'only recorded',
    );
    expect(left.length).toBeGreaterThan(2);
    expect(left.some(({ reason }) => /withheld|refused|missed/.test(reason ?? ''))).toBe(true);
  });
});

describe('the self-check at the end of a session', () => {
  it('notes that every decision came out the same, as the schema says', async () => {
    await noteReplay(session.folder);
    const description = readDescription(session.folder);
    expect(description.replay).toMatchObject({ identical: true });
    expect(description.replay!.decisions).toBeGreaterThan(50);
    expect(description.replay).not.toHaveProperty('difference');
    const validate = new Ajv2020({ strict: false }).compile(
      JSON.parse(readFileSync(sessionSchemaFile(), 'utf8')),
    );
    expect(validate(description), JSON.stringify(validate.errors)).toBe(true);
  });

  it('notes the first difference when the rules in the folder were changed', async () => {
    const file = join(session.folder, 'rules.yaml');
    writeFileSync(file, rules.replace('reaches 90 cm', 'reaches 91 cm'));
    const note = await noteReplay(session.folder);
    writeFileSync(file, rules);
    expect(note).toMatchObject({ identical: false });
    expect(note!.difference!.recorded).not.toBe(note!.difference!.replayed);
  });

  it('notes why it could not be made', async () => {
    const file = join(session.folder, 'rules.yaml');
    writeFileSync(file, 'title: [');
    const note = await noteReplay(session.folder);
    writeFileSync(file, rules);
    expect(note).toMatchObject({ identical: false, failed: expect.any(String) });
  });

  it('is made by the process that finishes the record', async () => {
    updateDescription(session.folder, {
      replay: { identical: false, inputs: 0, decisions: 0, commands: 0 },
    });
    await finish(session.folder);
    const { replay, record } = readDescription(session.folder);
    expect(record!.state).toBe('whole');
    expect(replay).toMatchObject({ identical: true });
    expect(replay!.inputs).toBe(record!.lastInput + 1);
  });
});
