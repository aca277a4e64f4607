import { dropsOf, type Lap, phasesOf } from '../../analysis/happenings.js';
import { countsByLap } from '../../analysis/lapCounts.js';
import type { SessionData } from '../../analysis/readSession.js';
import { Summariser } from '../../session/summary.js';
import { fixed, table } from './htmlTable.js';

/** Beside the plan: what came of each phase and of each rule. */
export function happened(session: SessionData, laps: readonly Lap[]): string {
  return [phases(session, laps), rules(session)].join('\n');
}

/** Laps that count, by the phase in force as they began; water whenever it was given. */
function phases(session: SessionData, laps: readonly Lap[]): string {
  const spans = phasesOf(session);
  if (spans.length === 0) return '';
  const countsOf = countsByLap(session);
  const drops = dropsOf(session);
  const rows = spans.map(({ phase, startUs, stopUs, lap, reason }) => {
    const within = laps.filter((one) => one.startUs >= startUs && one.startUs < stopUs);
    const sum = (of: 'licks' | 'firings' | 'shams') =>
      within.reduce((total, one) => total + countsOf(one.lap)[of], 0);
    const given = drops.filter(({ boardUs }) => boardUs >= startUs && boardUs < stopUs);
    return [
      ...[phase, lap, fixed((stopUs - startUs) / 60e6, 1), within.length],
      ...[sum('licks'), fixed(waterOf(given), 1)],
      ...[sum('firings'), sum('shams'), reason],
    ];
  });
  const head = ['phase', 'from lap', 'min', 'laps', 'licks', 'water (uL)', 'firings', 'shams'];
  return table([...head, 'began because'], rows);
}

const waterOf = (drops: readonly { readonly volumeUl: number }[]) =>
  drops.reduce((sum, { volumeUl }) => sum + volumeUl, 0);

/** Every rule of the file, those that never fired too. */
function rules(session: SessionData): string {
  const { decisions, rules: prepared } = session;
  const summariser = new Summariser(prepared.file.rules.map(({ name }) => name.name));
  for (const decision of decisions) summariser.take(decision);
  const rows = [...summariser.summary.rules].map(([name, rule]) => {
    const not = (kind: string) =>
      [...rule.not].reduce(
        (sum, [why, times]) => sum + (why.startsWith(`${kind}:`) ? times : 0),
        0,
      );
    return [
      ...[name, rule.fired, rule.shams],
      ...[not('withheld'), not('missed'), not('refused'), not('uncertain')],
    ];
  });
  return table(['rule', 'fired', 'shams', 'withheld', 'missed', 'refused', 'uncertain'], rows);
}
