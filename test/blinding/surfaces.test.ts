import { readdirSync, readFileSync, renameSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { writeNwb } from '../../server/export/nwb/writeNwb.js';
import { reportPage } from '../../server/export/report/page.js';
import { tablesOf } from '../../server/export/tables.js';
import { writeTables } from '../../server/export/writeTables.js';
import { LiveMask } from '../../server/session/blinding/liveMask.js';
import { unblindSession } from '../../server/session/blinding/openings.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { readDescription } from '../../server/session/description.js';
import { loadSession } from '../../server/session/loadSession.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { replaySession } from '../../server/session/replay.js';
import { noteReplay } from '../../server/session/selfCheck.js';
import { summarise } from '../../server/web/records/summarise.js';
import { startWeb } from '../web/webRig.js';
import { blindedPair } from './sessions.js';

let pair: ReturnType<typeof blindedPair>;
let stim: SessionData;
let sham: SessionData;

beforeAll(async () => {
  pair = blindedPair();
  stim = await readSession(pair.stim.folder);
  sham = await readSession(pair.sham.folder);
});
afterAll(() => pair.remove());

async function rawDecisions(folder: string): Promise<StampedDecision[]> {
  const decisions: StampedDecision[] = [];
  (await readRecord(folder)).visit({ decision: (one) => decisions.push(one) });
  return decisions;
}

/** A decision without the fine print of when. */
const plain = ({ input: _, boardUs: __, speedCmPerS: ___, ...rest }: StampedDecision) => rest;

const ofRules = (decisions: readonly StampedDecision[]) =>
  decisions.filter((one) => 'rule' in one && (one.rule === 'induce' || one.rule === 'flash'));

describe('what was done in a real and in a sham session', () => {
  it('differs in the record, or the test of its hiding would show nothing', async () => {
    const fired = (decisions: StampedDecision[]) =>
      decisions.flatMap((one) => (one.kind === 'fired' && one.rule === 'induce' ? [one.sham] : []));
    expect(new Set(fired(await rawDecisions(pair.stim.folder)))).toEqual(new Set([false]));
    expect(new Set(fired(await rawDecisions(pair.sham.folder)))).toEqual(new Set([true]));
  });

  it('names the arm nowhere in the record: neither in an input nor in what was drawn', async () => {
    const drawn = (await rawDecisions(pair.stim.folder)).filter(({ kind }) => kind === 'drawn');
    expect(drawn.map((one) => one.kind === 'drawn' && one.value)).toEqual(['sealed']);
    const text = readFileSync(`${pair.stim.folder}/session.json`, 'utf8');
    expect(text).not.toMatch(/"stim"/);
  });
});

describe('what reports, tables and exports are made from', () => {
  it('shows the same decisions for both arms, but for what the animal did after', () => {
    expect(ofRules(stim.decisions).map(plain)).toEqual(ofRules(sham.decisions).map(plain));
    expect(ofRules(stim.decisions).length).toBeGreaterThan(10);
    // One step at most: a time just before a tenth of a second, and one just after.
    const apart = ofRules(stim.decisions).map(
      ({ boardUs }, n) => boardUs - ofRules(sham.decisions)[n]!.boardUs,
    );
    expect(Math.max(...apart.map(Math.abs))).toBeLessThanOrEqual(100_000);
    expect(stim.decisions.map(({ kind }) => kind).sort()).toEqual(
      sham.decisions.map(({ kind }) => kind).sort(),
    );
  });

  it('tells firings no finer than to 0.1 s, so that their time does not say who began them', () => {
    for (const { boardUs, input } of ofRules(stim.decisions)) {
      expect(boardUs % 100_000).toBe(0);
      expect(input % 100).toBe(0);
    }
  });

  it('shows no level of what the arm decides about, nor its pulses', () => {
    const lines = ['gate', 'laser', 'marker'].map(
      (name) => stim.rig.outputs.find((output) => output.name === name)!.line,
    );
    const levels = ({ samples }: SessionData) =>
      samples.outputs.slice(0, samples.length).some((bits) => lines.some((n) => bits & (1 << n)));
    expect([levels(stim), levels(sham)]).toEqual([false, false]);
    const driven = ({ shapes }: SessionData) => new Set([...shapes.values()].map((s) => s.output));
    expect(driven(stim)).toEqual(driven(sham));
    expect(driven(stim).has('gate')).toBe(false);
  });

  it('makes the same firings table and counts for both', async () => {
    const cells = (session: SessionData) => {
      const table = tablesOf(session).find(({ name }) => name === 'firings')!;
      const at = table.columns.findIndex(({ name }) => name === 'sham');
      return [...table.rows].map((row) => row[at]);
    };
    expect(new Set(cells(stim))).toEqual(new Set(['0']));
    expect(cells(stim)).toEqual(cells(sham));
    const rules = async (folder: string) =>
      (await summarise(folder, () => {})).rules.map(({ name, fired, shams }) => [
        name,
        fired,
        shams,
      ]);
    expect(await rules(pair.stim.folder)).toEqual(await rules(pair.sham.folder));
  });

  it('makes a report that says nothing of a sham in either', () => {
    for (const session of [stim, sham]) {
      const page = reportPage(session).replace(/sham: arm is sham|stim or sham/g, '');
      expect(page).not.toMatch(/\bas sham\b|>sham</);
      expect(page).toMatch(/<td>induce<\/td><td>gate<\/td>/);
    }
  });

  it('makes tables and NWB files that differ in nothing that the arm decides', async () => {
    const written = async (session: SessionData, name: string) => {
      const into = join(pair.folder, name);
      writeTables(session, join(into, 'tables'));
      await writeNwb(session, join(into, 'session.nwb'), '2026-03-04T12:00:00+00:00');
      const pulses = readFileSync(join(into, 'tables/firings.csv'), 'utf8');
      return pulses
        .split('\r\n')
        .map((line) => line.split(',').filter((cell) => /[a-z]/.test(cell)));
    };
    expect(await written(stim, 'a')).toEqual(await written(sham, 'b'));
  });
});

describe('what is shown while the session runs', () => {
  const live = async (folder: string) => {
    const shown: { event: StampedDecision; at: number }[] = [];
    let nowUs = 0;
    const { sealed } = loadSession(folder).rules.program;
    const mask = new LiveMask(sealed!, (event) => shown.push({ event, at: nowUs }));
    for (const decision of await rawDecisions(folder)) {
      // The loop looks every 20 ms, whether anything happens or not.
      for (; nowUs + 20_000 <= decision.boardUs; nowUs += 20_000) mask.tick(nowUs + 20_000);
      mask.take(decision);
    }
    mask.flush();
    return shown;
  };

  it('comes at the same time after the place, to within a look of the loop', async () => {
    const [a, b] = [await live(pair.stim.folder), await live(pair.sham.folder)];
    const when = (list: typeof a) =>
      list.filter(({ event }) => event.kind === 'fired' && event.rule !== 'water');
    expect(when(a).map(({ event }) => plain(event))).toEqual(
      when(b).map(({ event }) => plain(event)),
    );
    const apart = when(a).map(({ at }, n) => Math.abs(at - when(b)[n]!.at));
    expect(Math.max(...apart)).toBeLessThanOrEqual(120_000);
    expect(a.some(({ event }) => event.kind === 'armed' && event.rule === 'induce')).toBe(false);
    expect(a.some(({ event }) => event.kind === 'pulse done' && event.rule === 'induce')).toBe(
      false,
    );
    expect(a.some(({ event }) => event.kind === 'pulse done' && event.rule === 'water')).toBe(true);
  });
});

describe('replaying a sealed session', () => {
  it('is identical where the key is, and refused where it is not', async () => {
    const { setup } = loadSession(pair.stim.folder);
    expect((await replaySession(pair.stim.folder, setup)).difference).toBeNull();
    renameSync(pair.keyFile, `${pair.keyFile}.away`);
    try {
      expect(loadSession(pair.stim.folder).setup.arm).toBeUndefined();
      const note = await noteReplay(pair.stim.folder);
      expect(note!.failed).toMatch(/The key is not at/);
      // What is shown needs no key.
      expect((await readSession(pair.stim.folder)).decisions).toEqual(stim.decisions);
    } finally {
      renameSync(`${pair.keyFile}.away`, pair.keyFile);
    }
    expect((await noteReplay(pair.stim.folder))!.identical).toBe(true);
  });
});

describe('downloading a sealed session', () => {
  it('is refused, since the raw record tells the arm', async () => {
    const { app } = await startWeb({ records: pair.sham.root });
    const [name] = readdirSync(pair.sham.root).filter((one) => one.startsWith('2026'));
    const answer = await app.inject(`/api/records/${name}/download?what=session`);
    expect([answer.statusCode, answer.json().code]).toEqual([409, 'BLINDING_SEALED']);
  });
});

describe('unblinding', () => {
  it('is logged with its reason, kept in the description, and shows everything from then on', async () => {
    const who = { by: 'kl', reason: 'the animal had a seizure' };
    expect(() => unblindSession(pair.sham.folder, { ...who, key: '/nowhere' })).toThrow(/nowhere/);
    expect(readDescription(pair.sham.folder).blinding!.opened).toBeUndefined();
    const opened = unblindSession(pair.sham.folder, who);
    expect(opened).toMatchObject({ arm: 'sham', ...who });
    expect(readDescription(pair.sham.folder).blinding!.opened).toEqual(opened);
    const log = readFileSync(`${pair.file}.openings.jsonl`, 'utf8').trim().split('\n');
    expect(log.map((line) => JSON.parse(line))).toEqual([expect.objectContaining(who)]);
    const { decisions } = await readSession(pair.sham.folder);
    expect(decisions).toEqual(await rawDecisions(pair.sham.folder));
    // Asked again, nothing is opened that was not open.
    expect(unblindSession(pair.sham.folder, { by: 'x', reason: 'y' })).toEqual(opened);
  });
});
