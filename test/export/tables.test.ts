import { execFileSync, spawnSync } from 'node:child_process';
import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { dropsOf, licksOf } from '../../server/analysis/happenings.js';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { csvLine, fixed, seconds } from '../../server/export/table.js';
import { tablesOf } from '../../server/export/tables.js';
import { writeTables } from '../../server/export/writeTables.js';
import { readRecord } from '../../server/session/record/readRecord.js';
import { recordedSession } from '../analysis/recorded.js';
import { HARD_TEXT } from './hardText.js';

const recorded = recordedSession({
  minutes: 3,
  acts: [
    { act: 'note', text: HARD_TEXT },
    { act: 'exclude lap', lap: 2 },
  ],
});
afterAll(() => recorded.remove());
let session: SessionData;
const into = join(recorded.root, 'tables');
const column = (table: string, name: string): string[] => {
  const { columns, rows } = tablesOf(session).find((t) => t.name === table)!;
  const at = columns.findIndex((c) => c.name === name);
  return [...rows].map((row) => row[at]!);
};
beforeAll(async () => {
  session = await readSession(recorded.folder);
  writeTables(session, into);
});

describe('a CSV line', () => {
  it('quotes what RFC 4180 section 2 says must be quoted, and nothing else', () => {
    // The examples of RFC 4180, section 2, points 5 to 7.
    expect(csvLine(['aaa', 'b \r\nbb', 'ccc'])).toBe('aaa,"b \r\nbb",ccc\r\n');
    expect(csvLine(['aaa', 'b"bb', 'ccc'])).toBe('aaa,"b""bb",ccc\r\n');
  });
  it('keeps a microsecond in eight hours and writes no minus zero', () => {
    expect(seconds(8 * 3_600_000_000 + 1)).toBe('28800.000001');
    expect(fixed(-0.0001, 3)).toBe('0.000');
    expect(fixed(Number.NaN, 3)).toBe('');
  });
});

describe('the tables', () => {
  it('are the same bytes when written twice', () => {
    const again = writeTables(session, join(recorded.root, 'again'));
    const names = readdirSync(into).sort();
    expect(readdirSync(again).sort()).toEqual(names);
    expect(names).toContain('samples.csv');
    for (const name of names)
      expect(readFileSync(join(again, name)).equals(readFileSync(join(into, name))), name).toBe(
        true,
      );
  });

  it('replace an earlier export, and never a folder of something else', () => {
    writeTables(session, join(recorded.root, 'again'));
    const other = join(recorded.root, 'other');
    mkdirSync(other);
    writeFileSync(join(other, 'thesis.txt'), 'mine');
    expect(() => writeTables(session, other)).toThrow('something else');
    expect(readdirSync(other)).toEqual(['thesis.txt']);
  });

  it("hold the engine's own counts of laps, licks and water", () => {
    const { core } = recorded;
    expect(licksOf(session).filter(({ artefact }) => !artefact)).toHaveLength(core.licks);
    const laps = column('laps', 'lap').map(Number);
    expect(laps.at(-1)).toBe(core.instant.lap);
    const given = dropsOf(session).reduce((sum, { volumeUl }) => sum + volumeUl, 0);
    expect(given).toBeCloseTo(core.guard.waterGivenNl / 1_000, 9);
    const byLap = column('laps', 'water_ul')
      .map(Number)
      .reduce((a, b) => a + b, 0);
    expect(byLap).toBeCloseTo(given, 6);
    expect(column('samples', 'time_s').length).toBe(session.samples.length);
  });

  it('mark the partial first stretch, the lap cut short and the excluded lap', () => {
    expect(column('laps', 'complete').map(Number).slice(0, 2)).toEqual([0, 1]);
    expect(column('laps', 'complete').at(-1)).toBe('0');
    expect(column('laps', 'excluded').indexOf('1')).toBe(column('laps', 'lap').indexOf('2'));
  });

  it('put each firing within its stated uncertainty of the place intended', () => {
    const at = column('firings', 'rise_cm');
    const place = column('firings', 'place_cm');
    expect(at.length).toBeGreaterThan(5);
    const errors = column('firings', 'error_mm');
    at.forEach((text, i) => {
      if (text === '' || place[i] === '') return;
      expect((Number(text) - Number(place[i])) * 10).toBeCloseTo(Number(errors[i]), 1);
    });
  });

  it('keep what a person typed, and what was withheld, with its reason', () => {
    const kinds = column('decisions', 'kind');
    const details = column('decisions', 'detail');
    expect(details.filter((_, i) => kinds[i] === 'note')).toContain(HARD_TEXT);
    const withheld = session.decisions.filter(({ kind }) => kind === 'withheld');
    expect(kinds.filter((kind) => kind === 'withheld')).toHaveLength(withheld.length);
  });

  it('say of every row which input of the record it came from', async () => {
    const kinds = new Map<number, string>();
    const reader = await readRecord(recorded.folder);
    reader.visit({
      sample: (input) => kinds.set(input, 'sample'),
      input: (input, { kind }) => kinds.set(input, kind),
    });
    for (const { name } of tablesOf(session)) {
      const inputs = column(name, 'input');
      expect(inputs.length, name).toBeGreaterThan(0);
      const from = new Set(inputs.map((text) => kinds.get(Number(text))));
      expect(from.has(undefined), name).toBe(false);
      if (name === 'samples') expect([...from]).toEqual(['sample']);
      if (name === 'inputs') expect([...from]).toEqual(['edge']);
      if (name === 'licks') expect([...from]).toEqual(['edge']);
      if (name === 'water') expect([...from]).toEqual(['outcome']);
    }
  });

  it('explain every column in the dictionary', () => {
    const lines = readFileSync(join(into, 'dictionary.csv'), 'utf8').trimEnd().split('\r\n');
    const columns = tablesOf(session).reduce((sum, table) => sum + table.columns.length, 0);
    expect(lines).toHaveLength(columns + 1);
  });
});

/** What a loader in another language must find: rows of each table, and sums of some columns. */
const expected = (lineBreak: string) => ({
  laps: column('laps', 'lap').length,
  licks: column('licks', 'time_s').length,
  samples: column('samples', 'time_s').length,
  lickS: column('licks', 'time_s').reduce((sum, text) => sum + Number(text), 0),
  onS: column('firings', 'on_s').reduce((sum, text) => sum + Number(text), 0),
  excluded: column('laps', 'excluded').filter((text) => text === '1').length,
  phases: column('phases', 'phase').join('|'),
  // Every text of a column, as bytes of UTF-8 in hexadecimal: no printing can change it.
  details: Buffer.from(
    column('decisions', 'detail').join('|').replaceAll('\r\n', lineBreak),
  ).toString('hex'),
});
/** @param lineBreak what the language makes of CR LF inside a text */
function same(printed: string, lineBreak = '\r\n'): void {
  const found = JSON.parse(printed) as Record<string, number | string>;
  for (const [name, value] of Object.entries(expected(lineBreak))) {
    if (typeof value === 'string') expect(found[name], name).toBe(value);
    else expect(found[name], name).toBeCloseTo(value, 5);
  }
}
/** The program's output, or undefined (and a notice) where the program is not installed. */
function run(program: string, args: string[], stdin?: string): string | undefined {
  if (spawnSync(program, ['--version']).error !== undefined) {
    console.log(`notice: ${program} is not installed, so its loader is not run here`);
    return undefined;
  }
  return execFileSync(program, args, { input: stdin ?? '', encoding: 'utf8', cwd: into });
}

describe('the loaders that stand beside the tables', { timeout: 120_000 }, () => {
  it('read them in Python with its standard library alone', () => {
    const code = `
import json
from load_session import load_session
s = load_session(".")
print(json.dumps({
  "laps": len(s["laps"]["lap"]), "licks": len(s["licks"]["time_s"]),
  "samples": len(s["samples"]["time_s"]), "lickS": sum(s["licks"]["time_s"]),
  "onS": sum(x or 0 for x in s["firings"]["on_s"]), "excluded": sum(s["laps"]["excluded"]),
  "phases": "|".join(s["phases"]["phase"]),
  "details": "|".join(s["decisions"]["detail"]).encode().hex()}))`;
    const printed = run('python3', ['-B', '-c', code]);
    if (printed !== undefined) same(printed);
  });
  it('read them in R', () => {
    const code = `source("load_session.R"); s <- load_session(".")
cat(sprintf('{"laps":%d,"licks":%d,"samples":%d,"lickS":%.9f,"onS":%.9f,"excluded":%d,"phases":"%s","details":"%s"}',
  nrow(s$laps), nrow(s$licks), nrow(s$samples), sum(s$licks$time_s),
  sum(s$firings$on_s, na.rm = TRUE), sum(s$laps$excluded), paste(s$phases$phase, collapse = "|"),
  paste(as.character(charToRaw(paste(s$decisions$detail, collapse = "|"))), collapse = "")))`;
    const printed = run('Rscript', ['--vanilla', '-e', code]);
    if (printed !== undefined) same(printed, '\n');
  });
  it('read them in Octave', () => {
    const code = `s = load_session('.'); on = s.firings.on_s;
printf('{"laps":%d,"licks":%d,"samples":%d,"lickS":%.9f,"onS":%.9f,"excluded":%d,"phases":"%s","details":"%s"}', ...
  numel(s.laps.lap), numel(s.licks.time_s), numel(s.samples.time_s), sum(s.licks.time_s), ...
  sum(on(~isnan(on))), sum(s.laps.excluded), strjoin(s.phases.phase', '|'), ...
  sprintf('%02x', uint8(strjoin(s.decisions.detail', '|'))));`;
    const printed = run('octave-cli', ['--no-gui', '--eval', code]);
    if (printed !== undefined) same(printed);
  });
  it('are of about 20 lines each', () => {
    for (const name of ['load_session.py', 'load_session.R', 'load_session.m'])
      expect(readFileSync(join(into, name), 'utf8').trim().split('\n').length).toBeLessThan(24);
  });
});
