import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { dropsOf, lapsOf } from '../../server/analysis/happenings.js';
import { learnedOf, omissionsOf } from '../../server/analysis/learned.js';
import { lickingOf } from '../../server/analysis/licking.js';
import { profileOf } from '../../server/analysis/profile.js';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { reportPage } from '../../server/export/report/page.js';
import { hasLearned } from '../../server/rules/learned.js';
import { recordedSession } from './recorded.js';

const RULES = `
title: Water with omissions
belt: 180 cm
places:
  approach: 65 to 90 cm
rules:
  water:
    when: reaches 90 cm
    sham: lap is a multiple of 5
    do: give 4 uL
  induce:
    when: reaches 45 cm
    if: lap is a multiple of 4
    do: pulse gate for 300 ms
    within: 1 cm
  told:
    when: lap begins
    if: learned in approach
    do: note
end: laps done this session >= 26 or time >= 20 min
`;
const recorded = recordedSession({ rules: RULES, minutes: 10 });
afterAll(() => recorded.remove());
let session: SessionData;
let page: string;
beforeAll(async () => {
  session = await readSession(recorded.folder);
  page = reportPage(session);
});
function taken() {
  const laps = lapsOf(session).filter(({ complete }) => complete);
  const profile = profileOf(session, laps);
  return { laps, profile, licking: lickingOf(session, laps, profile) };
}

describe('the criterion of having learned', () => {
  it('asks for licks, their share and slowing, each at its bound', () => {
    const met = {
      ...{ licks: 10, licksInSpan: 7, distance: 180, distanceInSpan: 24 },
      ...{ duration: 9300, durationInSpan: 1500 },
    };
    // 24 cm in 1.5 s is 16 cm/s; 156 cm in 7.8 s is 20 cm/s.
    expect(hasLearned(met)).toBe(true);
    expect(hasLearned({ ...met, licks: 9, licksInSpan: 9 })).toBe(false);
    expect(hasLearned({ ...met, licks: 11 })).toBe(false);
    expect(hasLearned({ ...met, durationInSpan: 1400, duration: 9200 })).toBe(false);
    expect(hasLearned({ ...met, durationInSpan: 0 })).toBeUndefined();
  });

  it('is found in the record on the laps on which the rule of the session found it', () => {
    const { laps, profile, licking } = taken();
    const learned = learnedOf(laps, profile, licking)!;
    expect(learned.toCm).toBeCloseTo(90, 0);
    expect(learned.of).toBe(laps.length - 9);
    // A rule is asked as the next lap begins. Bins of 3 cm blur the edge of the span a little.
    const told = session.decisions
      .filter((d) => d.kind === 'fired' && d.rule === 'told')
      .map(({ lap }) => lap - 1);
    expect(told.length).toBeGreaterThan(0);
    expect(Math.abs(learned.met - told.length)).toBeLessThanOrEqual(2);
    expect(Math.abs(learned.firstLap! - told[0]!)).toBeLessThanOrEqual(2);
  });

  it('laps without water are set beside the others', () => {
    const { laps, licking } = taken();
    const [water, none] = omissionsOf(licking, dropsOf(session));
    expect(water!.laps + none!.laps).toBe(laps.length);
    expect(none!.laps).toBe(laps.filter(({ lap }) => lap % 5 === 0).length);
    // Without a drop to drink every lick waits for one.
    expect(none!.licksPerLap).toBeGreaterThan(water!.licksPerLap);
  });

  it('stands in the report with its words, and so do the predicted fields', () => {
    expect(page).toContain('<h2>Learning</h2>');
    expect(page).toContain('It is no test of significance.');
    expect(page).toContain('laps without (omission)');
    const fields = session.decisions.filter((d) => d.kind === 'field predicted');
    expect(fields.length).toBeGreaterThan(3);
    expect(page).toContain('Fields predicted from the run');
    expect(page).toContain('Predicted, not measured');
    for (const field of fields) {
      if (field.kind !== 'field predicted') continue;
      expect(Math.max(...field.curve)).toBe(1);
      expect(field.curve).toHaveLength(180);
      expect(page).toContain(field.widthCm.toFixed(1));
    }
  });
});
