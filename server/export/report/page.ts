import { firingsOf } from '../../analysis/firings.js';
import { dropsOf, lapsOf } from '../../analysis/happenings.js';
import { lickingOf } from '../../analysis/licking.js';
import { type Loopback, measureBack } from '../../analysis/loopback.js';
import { profileOf } from '../../analysis/profile.js';
import type { SessionData } from '../../analysis/readSession.js';
import { explain } from '../../rules/explain.js';
import { factsOf } from '../../session/rig/rig.js';
import { cautions, facts } from './facts.js';
import type { Shown } from './figures.js';
import * as figures from './figures.js';
import { health, notDone, statistics } from './findings.js';
import { happened } from './happened.js';
import { learned } from './learned.js';
import { escapeHtml } from './plot.js';
import { predictedFields } from './predictedFields.js';
import { proofs } from './proofSheet.js';

/** For the screen and for paper. */
export const STYLE = `
body { font: 15px/1.45 Georgia, 'DejaVu Serif', serif; color: #111; background: #fff; max-width: 760px; margin: 24px auto; padding: 0 16px; }
h1 { font-size: 24px; margin: 0 0 4px; } h2 { font-size: 18px; border-top: 1px solid #999; padding-top: 10px; margin-top: 26px; }
h3 { font-size: 15px; margin: 16px 0 4px; } h1, h2, h3 { break-after: avoid; }
table { border-collapse: collapse; width: 100%; font-size: 13px; margin: 8px 0; font-variant-numeric: tabular-nums; }
th, td { text-align: left; padding: 2px 10px 2px 0; border-bottom: 1px solid #ddd; vertical-align: top; } td.n, th.n { text-align: right; }
.facts th { font-weight: normal; color: #333; width: 170px; } .facts td { overflow-wrap: anywhere; }
.wide { font-size: 11px; } .wide th, .wide td { padding: 1px 7px 1px 0; } .wide td { white-space: nowrap; } .scroll { overflow-x: auto; }
figure { margin: 8px 0 14px; break-inside: avoid; } figcaption { font-size: 13px; color: #333; }
svg { width: 100%; height: auto; font: 12px Georgia, 'DejaVu Serif', serif; } .small { font-size: 10px; fill: #333; }
pre { white-space: pre-wrap; font: 11px/1.35 'DejaVu Sans Mono', monospace; background: #f5f5f5; padding: 8px; } tr { break-inside: avoid; }
.bad { font-weight: bold; }
@page { margin: 16mm 14mm; }
@media print { .page { break-before: page; border: none; margin-top: 0; padding-top: 0; }
  body { margin: 0; padding: 0; max-width: none; font-size: 12px; } table, figcaption { font-size: 11px; }
  pre { font-size: 9px; columns: 2; column-gap: 16px; padding: 4px; } .wide { font-size: 8.5px; } .wide th, .wide td { padding-right: 4px; } .scroll { overflow: visible; }
}
`;

/**
 * The session as one self-contained HTML page for a lab book: no script, no network, and the same
 * bytes each time.
 * @param loopback an input that an output was wired back to, to measure firings by
 * @throws LapwingError REPORT_LOOPBACK where the rig has no such output or input
 */
export function reportPage(session: SessionData, loopback?: Loopback): string {
  const { description, rules, rig } = session;
  const laps = lapsOf(session).filter(({ complete, excluded }) => complete && !excluded);
  const profile = profileOf(session, laps);
  const shown: Shown = {
    ...{ lengthCm: rig.belt.lengthCm, laps, profile },
    licking: lickingOf(session, laps, profile),
    ...{ firings: firingsOf(session), drops: dropsOf(session) },
    stimuli: new Set(rig.outputs.filter((o) => o.kind === 'stimulus').map((o) => o.name)),
  };
  const proved = loopback && {
    wire: loopback,
    measured: measureBack(session, shown.firings, loopback),
  };
  const title = `${description.subject}: ${description.title}`;
  const body = [
    `<h1>${escapeHtml(title)}</h1>`,
    facts(session),
    '<h2>Cautions</h2>',
    cautions(session, shown, proved?.measured),
    '<h2>What was planned</h2>',
    `<pre>${escapeHtml(explain(rules.file, factsOf(rig)).trimEnd())}</pre>`,
    '<h2 class="page">What happened</h2>',
    happened(session, laps),
    laps.length === 0 ? '<p>No complete lap: there is nothing to draw.</p>' : drawn(shown),
    '<h2>Licking on the belt</h2>',
    statistics(session, shown),
    '<h2>Learning</h2>',
    learned(shown),
    predictedFields(session),
    '<h2>Proof sheet: every firing</h2>',
    proofs(session, shown.firings, proved),
    '<h2>Withheld, missed, refused, uncertain</h2>',
    notDone(session),
    '<h2>Health</h2>',
    health(session),
  ];
  return [
    `<!doctype html>\n<html lang="en"><head><meta charset="utf-8"><title>${escapeHtml(title)}</title>`,
    `<meta name="viewport" content="width=device-width"><style>${STYLE}</style></head><body>`,
    ...body,
    '</body></html>\n',
  ].join('\n');
}

function drawn(shown: Shown): string {
  const n = shown.laps.length;
  const third = Math.max(1, Math.floor(n / 3));
  const figure = (svg: string, words: string) =>
    `<figure>${svg}<figcaption>${words}</figcaption></figure>`;
  return [
    figure(
      figures.raster(shown),
      `Each of ${n} complete laps, the first on top: black ticks are licks that wait for water, grey ` +
        'ticks licks within 2 s of a drop, triangles drops, dots stimuli, rings shams.',
    ),
    figure(
      figures.speed(shown),
      `Time-weighted mean speed: the first ${third} laps (dashed, orange) and the last ${third} (solid, ` +
        "blue); shaded, one standard deviation of the laps' own means.",
    ),
    figure(figures.occupancy(shown), 'Time spent at each position.'),
    figure(
      figures.lickRate(shown),
      'Licks a second of time spent there: solid, licks that wait for water; dotted, all.',
    ),
    figure(
      figures.lickShares(shown),
      "Of the licks that wait for water: in the spout's place (5 cm to each side; dots) and in the " +
        '20 cm before it (rings).',
    ),
    figure(figures.firstLicks(shown), 'The first lick of each lap that drinks no drop.'),
    figure(
      figures.slowing(shown),
      'Speed in the 20 cm before the spout over speed on the rest of the belt; below 1 it slows.',
    ),
    figure(figures.slips(shown), "Slip by lap: the encoder's place less the seam mark's."),
    figure(figures.water(shown), 'Water given so far.'),
  ].join('\n');
}
