import { quantile } from '../../analysis/align/robustLine.js';
import type { Firing } from '../../analysis/firings.js';
import type { Loopback, MeasuredBack } from '../../analysis/loopback.js';
import type { SessionData } from '../../analysis/readSession.js';
import { counted, fixed, table } from './htmlTable.js';

/** What was measured back, and by which wire. */
export interface Proved {
  readonly wire: Loopback;
  readonly measured: MeasuredBack;
}

/** Armed firings and those decided in the host, each with its places and their uncertainty. */
export function proofs(
  session: SessionData,
  firings: readonly Firing[],
  proved: Proved | undefined,
): string {
  const section = (title: string, rows: readonly Firing[]) => {
    if (rows.length === 0) return `<h3>${title}</h3><p>None.</p>`;
    const head = [
      ...['lap', 'time (s)', 'rule', 'output', 'intended (cm)', 'as decided (cm)', 'error (mm)'],
      ...['after slip (cm)', 'latency (ms)', 'speed (cm/s)', 'on (ms)'],
      ...(proved === undefined ? [] : ['measured back (cm)', 'error (mm)', 'later (us)']),
    ];
    const lines = rows.map((f) => [
      ...[f.lap, fixed((f.boardUs - session.beganUs) / 1e6, 3), f.rule, f.output ?? 'sham'],
      fixed(f.placeCm, 2),
      plusMinus(f.riseCm, f.decidedUncertaintyMm),
      fixed(f.errorMm, 2),
      plusMinus(f.correctedCm, f.correctedUncertaintyMm),
      fixed(f.latencyUs === null ? null : f.latencyUs / 1e3, 2),
      fixed(f.speedCmPerS, 1),
      fixed(f.onUs === null ? null : f.onUs / 1e3, 1),
      ...(proved === undefined ? [] : measuredCells(proved, f)),
    ]);
    return `<h3>${title}</h3>${errorsInWords(rows)}<div class="scroll">${table(head, lines, 'wide')}</div>`;
  };
  return [
    proved === undefined ? '' : measuredInWords(proved),
    section(
      'Started by the board at the place',
      firings.filter((f) => f.armed && !f.sham),
    ),
    section(
      'Decided in the host',
      firings.filter((f) => !f.armed && !f.sham),
    ),
    section(
      'Shams: nothing was driven',
      firings.filter((f) => f.sham),
    ),
    '<p>As decided: by the counts of that moment; after &#177;, half a count and the usual slip of ' +
      "this session up to there. After slip: the lap's slip, found at the next mark, shared out " +
      'evenly; after &#177;, how far off that can be if it all came at once. Latency: from the ' +
      'decision in the host to the rise; the board itself starts an armed one at the place.</p>',
  ].join('\n');
}

function errorsInWords(rows: readonly Firing[]): string {
  const errors = rows.flatMap(({ errorMm }) => (errorMm === null ? [] : [Math.abs(errorMm)]));
  if (errors.length === 0) return '';
  const latencies = rows.flatMap(({ latencyUs }) => (latencyUs === null ? [] : [latencyUs / 1e3]));
  const late =
    latencies.length === 0
      ? ''
      : ` Latency: median ${fixed(quantile(latencies, 0.5), 2)} ms, at most ${fixed(Math.max(...latencies), 2)} ms.`;
  return (
    `<p>${counted(rows.length, 'firing')}; from the place intended: median ` +
    `${fixed(quantile(errors, 0.5), 2)} mm, at most ${fixed(Math.max(...errors), 2)} mm.${late}</p>`
  );
}

/** A wire that was looked at is told of even where it showed nothing. */
function measuredInWords({ wire, measured }: Proved): string {
  const all = [...measured.firings.values()];
  const seen = all.flatMap((one) => (one === null ? [] : [one.laterUs]));
  const spread =
    seen.length === 0
      ? ''
      : ` The rise was seen ${quantile(seen, 0.5).toFixed(0)} us (median), ` +
        `${Math.min(...seen)} to ${Math.max(...seen)} us after the board's own stamp.`;
  const missing = all.length - seen.length;
  const extra = measured.unexplained.length;
  return (
    `<p>Measured back: ${wire.output} is wired to ${wire.input}. ` +
    `${seen.length} of ${all.length} firings were seen there.${spread}` +
    (missing > 0 ? ` <b class="bad">${missing} were not seen.</b>` : '') +
    (extra > 0 ? ` <b class="bad">${extra} rises there belong to no firing.</b>` : '') +
    ' The place is by the count that the board read at that edge.</p>'
  );
}

function measuredCells({ wire, measured }: Proved, firing: Firing): string[] {
  if (firing.output !== wire.output) return ['', '', ''];
  const seen = measured.firings.get(firing);
  if (!seen) return ['not seen', '', ''];
  return [fixed(seen.placeCm, 2), fixed(seen.errorMm, 2), String(seen.laterUs)];
}

function plusMinus(cm: number | null, mm: number | null): string {
  return mm === null ? fixed(cm, 2) : `${fixed(cm, 2)} \u00b1${(mm / 10).toFixed(2)}`;
}
