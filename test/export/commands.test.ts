import { cpSync, existsSync, readFileSync, truncateSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { ownEdges } from '../../server/analysis/align/alignSession.js';
import { readSession } from '../../server/analysis/readSession.js';
import { readDescription, updateDescription } from '../../server/session/description.js';
import { recordedSession } from '../analysis/recorded.js';
import { finished, lapwing } from '../tools/liveRig.js';

const recorded = recordedSession({ minutes: 2 });
afterAll(() => recorded.remove());
const { folder, root } = recorded;
/** The same session as another animal's. */
const other = join(root, 'other');
cpSync(folder, other, { recursive: true });
updateDescription(other, { subject: 'm08' });

const path = (name: string) => join(root, name);

async function run(...args: string[]) {
  const { status, out, err } = await finished(lapwing(...args));
  return { status, out, err };
}
/** What a command prints for a script: JSON and nothing else. */
async function json(...args: string[]) {
  const { status, out, err } = await run(...args, '--json');
  expect(status, err).toBe(0);
  expect(err).toBe('');
  return JSON.parse(out) as Record<string, unknown>;
}

describe('what a script would call', { timeout: 120_000 }, () => {
  it('exports in each format into the place it is told', async () => {
    for (const [format, file] of [
      ['tables', 'laps.csv'],
      ['parquet', 'laps.parquet'],
      ['nwb', ''],
    ] as const) {
      const into = path(`as-${format}`);
      expect(await json('export', folder, '--to', format, '--into', into)).toEqual({
        ...{ format, path: into },
      });
      expect(existsSync(join(into, file))).toBe(true);
    }
    const unknown = await run('export', folder, '--to', 'slides');
    expect(unknown.status).toBe(1);
    expect(unknown.err).toContain('EXPORT_FORMAT_UNKNOWN');
  });

  it('reports on a session, and across animals, a session named twice counting once', async () => {
    const one = await json('report', folder, '--into', path('one.html'));
    expect(one).toMatchObject({ path: path('one.html'), session: { subject: 'm07' } });
    const into = path('both.html');
    const both = await json('report', folder, other, `${folder}/.`, '--into', into);
    expect(both).toMatchObject({
      animals: [
        { subject: 'm07', days: [{ subject: 'm07' }] },
        { subject: 'm08', days: [{ subject: 'm08' }] },
      ],
      across: { lapsPerMinute: { n: 2 }, lickShare: { n: 2 } },
    });
    expect(readFileSync(into, 'utf8')).toContain('2 animals, 2 sessions');
    const wired = await run('report', folder, other, '--loopback', 'gate=spikes');
    expect(wired).toMatchObject({ status: 1, err: 'error: --loopback is for one session\n' });
  });

  it('aligns with the edges of another instrument', async () => {
    const { times } = ownEdges(await readSession(folder), 'seam');
    const edges = path('edges.csv');
    writeFileSync(edges, times.map((t) => `${(t * 1.0001 + 5).toFixed(6)}\n`).join(''));
    const found = await json('align', folder, edges, '--line', 'seam');
    expect(found).toMatchObject({ line: 'seam', edges: times.length, refused: [] });
    const [fit] = found.alignments as { driftPpm: number; matched: number }[];
    expect(fit!.driftPpm).toBeCloseTo(100, 0);
    expect(existsSync(found.events as string)).toBe(true);
  });

  it('replays, and says what other rules would have done', async () => {
    expect(await json('replay', folder)).toMatchObject({ difference: null });
    const rules = path('rules.yaml');
    const text = readFileSync(join(folder, 'rules.yaml'), 'utf8');
    writeFileSync(rules, text.replace('reaches 90 cm', 'reaches 70 cm'));
    const would = await json('replay', folder, '--rules', rules);
    expect((would.counts as Record<string, number>).moved).toBeGreaterThan(2);
  });

  it('mends a torn record, and tells what is missing and that the rest replays', async () => {
    const torn = path('torn');
    cpSync(folder, torn, { recursive: true });
    truncateSync(join(torn, 'record.mcap'), 100_000);
    updateDescription(torn, { ended: null });
    expect(await json('mend', torn)).toMatchObject({
      ...{ state: 'torn', originals: ['original-1.mcap'], replay: { identical: true } },
      missing: [expect.stringContaining('cannot be read')],
    });
    expect(readDescription(torn).ended).toMatchObject({ how: 'mended' });
    const again = await run('mend', torn);
    expect(again.out).toContain('all identical');
  });
});
