import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Firing, firingsOf } from '../../server/analysis/firings.js';
import { type MeasuredBack, measureBack } from '../../server/analysis/loopback.js';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { reportPage } from '../../server/export/report/page.js';
import { recordedSession } from './recorded.js';

// The demo's rig: output `gate` is line 2, input `spikes` line 2.
const recorded = recordedSession({
  ...{ minutes: 4, simulated: { loopback: { output: 2, input: 2 } } },
});
afterAll(() => recorded.remove());
const wire = { output: 'gate', input: 'spikes' };
let session: SessionData;
let firings: Firing[];
let measured: MeasuredBack;
beforeAll(async () => {
  session = await readSession(recorded.folder);
  firings = firingsOf(session);
  measured = measureBack(session, firings, wire);
});

describe('an output that is wired back to an input', () => {
  it('shows every firing where and when the board said, the delay of the wire later', () => {
    const gate = firings.filter(({ output, sham }) => output === 'gate' && !sham);
    expect(gate.length).toBeGreaterThan(3);
    expect([...measured.firings.keys()]).toEqual(gate);
    for (const firing of gate) {
      const seen = measured.firings.get(firing)!;
      // The simulated wire takes 3 us, in which the belt comes no whole count (0.4 mm) far.
      expect(seen.laterUs).toBe(3);
      expect(Math.abs(seen.placeCm! - firing.riseCm!)).toBeLessThan(0.041);
      expect(seen.errorMm!).toBeCloseTo((seen.placeCm! - firing.placeCm!) * 10, 9);
    }
    expect(measured.unexplained).toEqual([]);
  });

  it('tells of firings that were not seen, and of rises that nobody fired', () => {
    const rises = session.edges.filter(({ name, level }) => name === 'spikes' && level === 1);
    const strange = { ...rises[1]!, boardUs: rises[1]!.boardUs + 400_000 };
    const edges = session.edges
      .filter((edge) => edge !== rises[0])
      .concat(strange)
      .sort((a, b) => a.boardUs - b.boardUs);
    const other = { ...session, edges };
    const found = measureBack(other, firings, wire);
    expect([...found.firings.values()].map((seen) => seen === null)).toEqual(
      rises.map((_, i) => i === 0),
    );
    expect(found.unexplained).toEqual([strange]);
    const page = reportPage(other, wire);
    expect(page).toContain('1 firing not seen on the loopback input.');
    expect(page).toContain('The loopback input rose 1 time without a firing.');
    expect(page).toContain('>not seen<');
  });

  it('stands in the proof sheet beside what the board said', () => {
    const page = reportPage(session, wire);
    const gate = measured.firings.size;
    expect(page).toContain(`${gate} of ${gate} firings were seen there.`);
    expect(page).toContain('measured back (cm)');
    expect(page).not.toContain('not seen');
    expect(reportPage(session)).not.toContain('measured back');
  });

  it('must be named as in the rig file', () => {
    for (const wrong of [
      { output: 'gate', input: 'nowhere' },
      { output: 'spikes', input: 'gate' },
    ])
      expect(() => reportPage(session, wrong)).toThrow(
        expect.objectContaining({ code: 'REPORT_LOOPBACK' }),
      );
  });
});
