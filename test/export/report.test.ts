import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { firingsOf } from '../../server/analysis/firings.js';
import { lapsOf, licksOf, phasesOf } from '../../server/analysis/happenings.js';
import { lickingOf } from '../../server/analysis/licking.js';
import { profileOf } from '../../server/analysis/profile.js';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { reportPage } from '../../server/export/report/page.js';
import { recordedSession } from '../analysis/recorded.js';

const recorded = recordedSession({
  minutes: 6,
  acts: [
    { act: 'exclude lap', lap: 3 },
    { act: 'note', text: '<script>alert(1)</script>' },
  ],
});
afterAll(() => recorded.remove());
let session: SessionData;
let page: string;
beforeAll(async () => {
  session = await readSession(recorded.folder);
  page = reportPage(session);
});

describe('what is counted for the report', () => {
  it('tells licks that drink from those that wait, and loses none', () => {
    const laps = lapsOf(session);
    const { before, drinking, spoutCm } = lickingOf(session, laps, profileOf(session, laps));
    expect(spoutCm).toBeGreaterThan(89);
    expect(spoutCm).toBeLessThan(91);
    const all = licksOf(session).filter(({ artefact }) => !artefact);
    expect(before.length + drinking.length).toBe(all.length);
    expect(drinking.length).toBeGreaterThan(10);
    expect(drinking.every((l) => l.positionCm! > 80)).toBe(true);
  });

  it("gives each lap's time and travel to the places where they were spent", () => {
    const laps = lapsOf(session).filter(({ complete }) => complete);
    const profile = profileOf(session, laps);
    profile.laps.forEach(({ seconds, travelCm }, i) => {
      const { startUs, stopUs } = laps[i]!;
      const sum = (values: Float64Array) => values.reduce((a, b) => a + b, 0);
      expect(sum(seconds)).toBeCloseTo((stopUs - startUs) / 1e6, 1);
      // Speed is taken over a window of 200 ms, so a lap's travel is known to a cm or two.
      expect(Math.abs(sum(travelCm) - 180)).toBeLessThan(4);
    });
  });

  it('corrects each rise by its share of the slip of its lap', () => {
    const slips = new Map(lapsOf(session).map(({ lap, slipMm }) => [lap, slipMm]));
    const corrected = firingsOf(session).filter(({ correctedCm }) => correctedCm !== null);
    expect(corrected.length).toBeGreaterThan(5);
    for (const { lap, riseCm, correctedCm, placeCm } of corrected) {
      if (placeCm === null) continue;
      const slipMm = slips.get(lap)!;
      // The demo's mark is at 0 cm, and counts are 0.4 mm apart.
      expect((riseCm! - correctedCm!) * 10).toBeCloseTo((slipMm * riseCm!) / 180, 1);
    }
  });

  it('finds half the slip half way round, on a belt that slips evenly', async () => {
    const belt = { slipPerLapCm: 0.8, slipSpreadCm: 0 };
    const slipping = recordedSession({ minutes: 4, simulated: { belt } });
    const own = await readSession(slipping.folder);
    const water = firingsOf(own).filter((f) => f.rule === 'water' && f.correctedCm !== null);
    expect(water.length).toBeGreaterThan(5);
    for (const { riseCm, correctedCm, correctedUncertaintyMm } of water) {
      // 8 mm a lap, and water at 90 of 180 cm; the mark itself is seen to about a mm.
      expect(Math.abs(riseCm! - correctedCm!) * 10).toBeGreaterThan(3.2);
      expect(Math.abs(riseCm! - correctedCm!) * 10).toBeLessThan(4.8);
      expect(correctedUncertaintyMm).toBeGreaterThan(3);
    }
    slipping.remove();
  });
});

describe('the page', () => {
  it('stands by itself: no script, no network, and well-formed figures', () => {
    expect(page).not.toMatch(/<script|https?:|url\(|@import|<link|<img/);
    const figures = page.match(/<svg[\s\S]*?<\/svg>/g)!;
    expect(figures).toHaveLength(10);
    for (const figure of figures) {
      expect(figure).toContain('<title>');
      expect(figure).not.toMatch(/NaN|Infinity|undefined/);
    }
  });

  it('shows every firing, by the board and by the host apart', () => {
    const rows = page
      .split('<table class="wide">')
      .slice(1)
      .map((t) => t.split('</table>')[0]!);
    const shown = rows.reduce((sum, table) => sum + table.split('<tr>').length - 2, 0);
    expect(shown).toBe(firingsOf(session).length);
    expect(page).toContain('Started by the board at the place');
    expect(page).toContain('Decided in the host');
  });

  it('sets what came of each rule and each phase beside the plan', () => {
    const { decisions } = session;
    const row = (first: string, ...cells: (string | number)[]) =>
      `<tr><td>${first}</td>${cells.map((cell) => `<td class="n">${cell}</td>`).join('')}</tr>`;
    const firedBy = (rule: string, sham: boolean) =>
      new Set(
        decisions.flatMap((d) =>
          d.kind === 'fired' && d.rule === rule && d.sham === sham ? [d.serial] : [],
        ),
      ).size;
    for (const rule of ['water', 'induce', 'treat'])
      expect(page).toContain(row(rule, firedBy(rule, false), firedBy(rule, true), 0, 0, 0, 0));
    const laps = lapsOf(session).filter((lap) => lap.complete && !lap.excluded);
    const [first, second] = phasesOf(session);
    const during = laps.filter(({ startUs }) => startUs < second!.startUs);
    const minutes = ((second!.startUs - first!.startUs) / 60e6).toFixed(1);
    expect(page).toContain(
      `<tr><td>baseline</td><td class="n">0</td><td class="n">${minutes}</td><td class="n">${during.length}</td>`,
    );
  });

  it("says what the animal's book said before it began, and that it was begun all the same", () => {
    const animal = {
      ...{ folder: '/animals', rig: 'demo', kept: true, weightG: 19.4, percent: 78.25 },
      ...{ leastPercent: 80, protocol: 'P-2026-014', targetUl: 1_000 },
      ...{ against: ['it is too light'], despite: 'the vet said so' },
    };
    const description = { ...session.description, animal, waterEarlierUl: 120 };
    const told = reportPage({ ...session, description });
    expect(told).toContain('19.4 g, 78.3 % of its baseline (at least 80 %)');
    expect(told).toContain('120.0 uL earlier that day, 1000 uL a day is its target');
    expect(told).toContain('<li>Before it began: it is too light.</li>');
    expect(told).toContain('<li>It was begun all the same: the vet said so</li>');
    expect(page).not.toContain('<th>weight</th>');
  });

  it('names the lap that the operator left out, and leaves it out of the figures', () => {
    expect(page).toContain('Laps left out by the operator: 3.');
    const complete = lapsOf(session).filter((lap) => lap.complete && !lap.excluded);
    expect(page).toContain(`Each of ${complete.length} complete laps`);
  });

  it('is the same page each time', () => {
    expect(reportPage(session)).toBe(page);
  });

  it('of a session without a lap says so', async () => {
    const rules =
      'title: Nothing\nbelt: 180 cm\nrules:\n  none:\n    when: session begins\n    do: note\nend: time >= 2 s\n';
    const empty = recordedSession({ rules, minutes: 1, simulated: { startCm: 20 } });
    const short = reportPage(await readSession(empty.folder));
    expect(short).toContain('No complete lap');
    expect(short).not.toMatch(/NaN|Infinity|undefined/);
    empty.remove();
  });
});
