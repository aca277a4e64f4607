import { quantile } from '../../analysis/align/robustLine.js';
import { bootstrap, seedOf } from '../../analysis/bootstrap.js';
import { circularSummary } from '../../analysis/circular.js';
import { dropsOf, lapsOf } from '../../analysis/happenings.js';
import type { MeasuredBack } from '../../analysis/loopback.js';
import type { SessionData } from '../../analysis/readSession.js';
import { describeTroubles } from '../../session/record/recordState.js';
import type { Shown } from './figures.js';
import { counted, factsTable, fixed, table } from './htmlTable.js';
import { escapeHtml } from './plot.js';

export function facts(session: SessionData): string {
  const { description, beganUs, endedUs, rig, state } = session;
  const { software, board, seed, ended, water, replay } = description;
  const minutes = (endedUs - beganUs) / 60e6;
  const given = dropsOf(session).reduce((sum, { volumeUl }) => sum + volumeUl, 0);
  const uncertain = water?.uncertainUl ?? 0;
  const check =
    replay === undefined
      ? 'not made yet: `lapwing replay` makes it'
      : replay.identical
        ? `identical: ${replay.inputs} inputs, ${replay.decisions} decisions, ${replay.commands} commands`
        : (replay.failed ?? `different at input ${replay.difference?.input}`);
  return factsTable([
    ['session', description.name],
    ['started', `${description.startedAt}, ${minutes.toFixed(1)} min`],
    ['experimenter', description.experimenter ?? ''],
    ['session number', description.sessionNumber ?? ''],
    ['animal protocol', description.protocolNumber ?? ''],
    ['ended', ended === null ? 'not known' : `${ended.how}: ${ended.reason}`],
    ['rig', `${rig.name}, belt ${rig.belt.lengthCm} cm, board ${board?.model ?? 'not recorded'}`],
    ['software', `lapwing ${software.version}, seed ${seed}`],
    [
      'water',
      `${fixed(given, 1)} uL given${uncertain > 0 ? `, ${fixed(uncertain, 1)} uL uncertain` : ''}`,
    ],
    ['record', [state.state, ...describeTroubles(state)].join('; ')],
    ['replay of the record', check],
    ...description.files.map(
      ({ role, source, sha256 }) =>
        [`${role} file`, `${source}, SHA-256 ${sha256.slice(0, 16)}...`] as const,
    ),
  ]);
}

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
  const seed = seedOf(session.description.seed);
  const rows = licking.laps.filter(({ licks }) => licks > 0);
  const share = bootstrap(
    rows,
    (drawn) =>
      drawn.reduce((sum, r) => sum + r.inSpout + r.inApproach, 0) /
      drawn.reduce((sum, r) => sum + r.licks, 0),
    seed,
  );
  const slow = bootstrap(
    licking.laps.filter((r) => Number.isFinite(r.slowing)),
    (drawn) =>
      quantile(
        drawn.map((r) => r.slowing),
        0.5,
      ),
    seed,
  );
  const between = (i: typeof share) =>
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
        ['share of waiting licks at the spout or in the 20 cm before it', between(share)],
        ['speed before the spout over speed elsewhere, median of laps', between(slow)],
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

/** What whoever reads the numbers should know first. */
export function cautions(
  session: SessionData,
  { licking, laps, firings }: Shown,
  measured: MeasuredBack | undefined,
): string {
  const { decisions, description, state, rig } = session;
  const all = lapsOf(session);
  const excluded = all.filter((lap) => lap.excluded).map((lap) => lap.lap);
  const found: string[] = [];
  if (state.state !== 'whole')
    found.push(`The record is ${state.state}: see what is missing above.`);
  if (description.replay?.identical === false)
    found.push('A replay of the record did not give the same decisions.');
  if (description.board?.simulated) found.push('The board was simulated: no wire left it.');
  if (excluded.length > 0) found.push(`Laps left out by the operator: ${excluded.join(', ')}.`);
  const uncertain = decisions.filter(({ kind }) => kind === 'uncertain').length;
  if (uncertain > 0) found.push(`${counted(uncertain, 'firing')} uncertain: the board never said.`);
  const doubt = decisions.filter((d) => d.kind === 'trust' && d.trust === 'doubtful').length;
  if (doubt > 0) found.push(`Position became doubtful ${counted(doubt, 'time')}.`);
  const warn = (rig.belt.seam?.warnCm ?? Number.POSITIVE_INFINITY) * 10;
  const slipped = laps.filter(({ slipMm }) => slipMm !== null && Math.abs(slipMm) > warn);
  if (slipped.length > 0)
    found.push(`Slip of more than ${warn} mm on ${counted(slipped.length, 'lap')}.`);
  const artefacts = decisions.filter((d) => d.kind === 'lick' && d.artefact).length;
  if (artefacts > 0)
    found.push(`${counted(artefacts, 'lick')} left out that may be electrical artefacts.`);
  if (licking.spoutCm === null)
    found.push('No water at a known place: there is no spout to speak of.');
  if (laps.length < 10) found.push(`Only ${counted(laps.length, 'complete lap')}.`);
  const late = firings.filter((f) => (f.latencyUs ?? 0) > 10_000).length;
  if (late > 0) found.push(`${counted(late, 'firing')} rose more than 10 ms after being decided.`);
  const unseen = [...(measured?.firings.values() ?? [])].filter((seen) => seen === null).length;
  if (unseen > 0) found.push(`${counted(unseen, 'firing')} not seen on the loopback input.`);
  const extra = measured?.unexplained.length ?? 0;
  if (extra > 0) found.push(`The loopback input rose ${counted(extra, 'time')} without a firing.`);
  found.push(
    'The partial stretch before the first mark and the lap that the end cut short are in no figure.',
  );
  return `<ul>${found.map((caution) => `<li>${escapeHtml(caution)}</li>`).join('')}</ul>`;
}
