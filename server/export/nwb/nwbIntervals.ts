import type { Group } from 'h5wasm/node';
import { lapsOf, phasesOf } from '../../analysis/happenings.js';
import { countsByLap } from '../../analysis/lapCounts.js';
import type { SessionData } from '../../analysis/readSession.js';
import { Columns, INPUT_MEANING } from './columns.js';
import type { NwbBuilder } from './hdf5.js';

/** Laps with what happened on each, and phases: `TimeIntervals`. */
export function putIntervals(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const laps = lapsOf(session);
  const countsOf = countsByLap(session);
  put(nb, parent, 'laps', 'One row a lap; lap 0 is the partial stretch before the first mark', {
    rows: laps,
    columns: spans(laps, session)
      .whole('lap', 'Lap number', (l) => l.lap)
      .flag('complete', '1: the whole belt was run', (l) => l.complete)
      .flag('excluded', '1: the operator said to leave it out', (l) => l.excluded)
      .text('phase', 'Phase at its start', (l) => l.phase)
      .whole('cell', 'Which cell of the session, from 1', (l) => l.cell)
      .number('slip', "Encoder's place less the mark's at its end, metres", (l) =>
        l.slipMm === null ? null : l.slipMm / 1_000,
      )
      .whole('licks', 'Licks, possible artefacts left out', (l) => countsOf(l.lap).licks)
      .number('water', 'Microlitres given', (l) => countsOf(l.lap).waterUl)
      .whole('firings', 'Outputs fired, shams left out', (l) => countsOf(l.lap).firings)
      .whole('shams', 'Shams', (l) => countsOf(l.lap).shams)
      .whole('input', INPUT_MEANING, (l) => l.input),
  });
  const phases = phasesOf(session);
  put(nb, parent, 'phases', 'Phases of the rules file, one row as often as one began', {
    rows: phases,
    columns: spans(phases, session)
      .text('phase', 'Name', (p) => p.phase)
      .text('reason', 'Why it began', (p) => p.reason)
      .whole('lap', 'Lap in which it began', (p) => p.lap)
      .whole('input', INPUT_MEANING, (p) => p.input),
  });
}

interface Span {
  readonly startUs: number;
  readonly stopUs: number;
}

function spans<T extends Span>(rows: readonly T[], { beganUs }: SessionData): Columns<T> {
  return new Columns(rows)
    .number('start_time', 'Began, seconds', ({ startUs }) => (startUs - beganUs) / 1e6)
    .number('stop_time', 'Ended, seconds', ({ stopUs }) => (stopUs - beganUs) / 1e6);
}

function put<T>(
  nb: NwbBuilder,
  parent: Group,
  name: string,
  description: string,
  { rows, columns }: { readonly rows: readonly T[]; readonly columns: Columns<T> },
): void {
  if (rows.length === 0) return;
  const spec = { type: 'TimeIntervals', rows: rows.length, columns: columns.list } as const;
  nb.table(parent, name, { ...spec, description });
}
