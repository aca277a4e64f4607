import { seedOf } from '../../analysis/bootstrap.js';
import { circularSummary } from '../../analysis/circular.js';
import { lickingIntervals } from '../../analysis/lickingIntervals.js';
import type { SessionData } from '../../analysis/readSession.js';
import type { Shown } from './figures.js';
import { factsTable, fixed, table } from './htmlTable.js';

/** Numbers on licking, each with the method by which it was found. */
export function statistics(session: SessionData, { licking, laps, lengthCm }: Shown): string {
  const inside = new Set(laps.map(({ lap }) => lap));
  const placed = licking.before.filter((l) => l.positionCm !== null && inside.has(l.lap));
  const all = circularSummary(
    placed.map((l) => l.positionCm!),
    lengthCm,
  );
  const first = circularSummary(
    licking.laps.flatMap(({ firstCm }) => (firstCm === null ? [] : [firstCm])),
    lengthCm,
  );
  const { lickShare, slowing } = lickingIntervals(licking, seedOf(session.description.seed));
  const between = (i: typeof lickShare) =>
    `${fixed(i.estimate, 2)} (${fixed(i.low, 2)} to ${fixed(i.high, 2)})`;
  const circular = (c: typeof all) => [
    c.n,
    fixed(c.meanCm, 1),
    fixed(c.resultantLength, 3),
    c.pValue < 0.001 ? '< 0.001' : c.pValue.toFixed(3),
  ];
  return [
    table(
      ['', 'n', 'mean place (cm)', 'resultant length', 'Rayleigh p'],
      [
        ['licks that wait for water', ...circular(all)],
        ['first lick of each lap', ...circular(first)],
      ],
    ),
    table(
      ['', 'estimate (95 % interval)'],
      [
        ['share of waiting licks at the spout or in the 20 cm before it', between(lickShare)],
        ['speed before the spout over speed elsewhere, median of laps', between(slowing)],
      ],
    ),
    '<p>Circular mean, mean resultant length and Rayleigh test: Fisher, Statistical Analysis of ' +
      'Circular Data (1993), 2.3 and 4.3. Licks come in bouts, so the p of all licks is too small; ' +
      'that of first licks has one place a lap. Intervals: percentile bootstrap over laps, 2000 ' +
      'rounds, seeded by the session (Efron and Tibshirani 1993). They speak of this session alone: ' +
      'across animals the unit is the animal.</p>',
  ].join('\n');
}

/** What was not done and why, counted by rule and reason. */
export function notDone({ decisions }: SessionData): string {
  const counts = new Map<string, { times: number; laps: number[] }>();
  for (const d of decisions) {
    if (
      d.kind !== 'withheld' &&
      d.kind !== 'missed' &&
      d.kind !== 'refused' &&
      d.kind !== 'uncertain'
    )
      continue;
    const key = JSON.stringify([d.kind, d.rule, d.reason]);
    const found = counts.get(key) ?? { times: 0, laps: [] };
    found.times++;
    if (found.laps.at(-1) !== d.lap) found.laps.push(d.lap);
    counts.set(key, found);
  }
  if (counts.size === 0) return '<p>Nothing.</p>';
  const rows = [...counts].map(([key, { times, laps }]) => {
    const [kind, rule, reason] = JSON.parse(key) as [string, string, string];
    const listed = laps.length > 12 ? `${laps.slice(0, 12).join(', ')}, ...` : laps.join(', ');
    return [kind, rule, reason, times, listed];
  });
  return table(['', 'rule', 'why', 'times', 'laps'], rows);
}

export function health({ decisions, samples, beganUs, endedUs }: SessionData): string {
  const count = (kind: string) => decisions.filter((d) => d.kind === kind).length;
  const lost = decisions.reduce((sum, d) => sum + (d.kind === 'frames lost' ? d.frames : 0), 0);
  const links = (state: string) =>
    decisions.filter((d) => d.kind === 'link' && d.state === state && d.boardUs >= beganUs).length;
  const sensor = (state: string) =>
    decisions.filter((d) => d.kind === 'lick sensor' && d.state === state).length;
  const seam = (event: string) =>
    decisions.filter((d) => d.kind === 'seam' && d.event === event).length;
  return factsTable([
    [
      'samples',
      `${samples.length}, ${((samples.length * 1e6) / (endedUs - beganUs)).toFixed(0)} a second`,
    ],
    ['frames lost or bad', lost],
    ['link to the board lost', links('down')],
    ['program restarted', links('resumed')],
    ['faults that the board told', count('board fault')],
    ['lick sensor stuck', sensor('stuck')],
    ['lick sensor too fast', sensor('too fast')],
    ['seam marks accepted', seam('accepted')],
    ['seam marks missed or ignored', seam('missed') + seam('ignored')],
  ]);
}
