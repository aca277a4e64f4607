import type { Group } from 'h5wasm/node';
import { firingsOf } from '../../analysis/firings.js';
import { dropsOf, licksOf } from '../../analysis/happenings.js';
import type { SessionData } from '../../analysis/readSession.js';
import { toldOf } from '../../analysis/told.js';
import { Columns, INPUT_MEANING, metres } from './columns.js';
import { type NwbBuilder, text } from './hdf5.js';

interface EventsSpec<T> {
  readonly name: string;
  readonly rows: readonly T[];
  readonly description: string;
  readonly source: string;
  readonly columns: Columns<T>;
}

/** A table of events; none where nothing of it happened. */
function events<T>(nb: NwbBuilder, parent: Group, spec: EventsSpec<T>): void {
  const { name, rows, description, source, columns } = spec;
  if (rows.length === 0) return;
  const group = nb.table(parent, name, {
    ...{ type: 'EventsTable', description, rows: rows.length, columns: columns.list },
  });
  text(group, 'source_description', source);
}

/** Seconds since the session began, of something that has board time. */
const sinceBegan =
  ({ beganUs }: SessionData) =>
  ({ boardUs }: { readonly boardUs: number }) =>
    (boardUs - beganUs) / 1e6;

export function putLicksAndWater(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const at = sinceBegan(session);
  const licks = licksOf(session);
  events(nb, parent, {
    ...{ name: 'licks', rows: licks, source: 'Lick input' },
    description: 'Licks: beginnings of debounced contacts with the spout, stamped by the board',
    columns: new Columns(licks)
      .time('timestamp', 'Contact began', at)
      .whole('lap', 'Lap', (l) => l.lap)
      .number('position', 'Place on the belt, metres', (l) => metres(l.positionCm))
      .number('speed', 'Speed, metres a second', (l) => metres(l.speedCmPerS))
      .flag(
        'artefact',
        '1: so near to a change of an output that it may be electrical',
        (l) => l.artefact,
      )
      .whole('input', INPUT_MEANING, (l) => l.input),
  });
  const drops = dropsOf(session);
  events(nb, parent, {
    ...{ name: 'water', rows: drops, source: 'Valve output' },
    description: "Drops of water, by the board's word; volumes by the valve's calibration",
    columns: new Columns(drops)
      .time('timestamp', 'The valve opened', at)
      .time('duration', 'Open for', (d) => d.openUs / 1e6)
      .number('volume', 'Microlitres, by calibration', (d) => d.volumeUl)
      .text('output', 'The valve', (d) => d.output)
      .text('rule', 'Rule that gave it', (d) => d.rule)
      .whole('lap', 'Lap', (d) => d.lap)
      .number('position', 'Place on the belt, metres', (d) => metres(d.positionCm))
      .whole('input', INPUT_MEANING, (d) => d.input),
  });
}

/** What rules fired: places intended, as decided and corrected, with the uncertainty of each. */
export function putFirings(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const firings = firingsOf(session);
  const mm = (value: number | null) => (value === null ? null : value / 1_000);
  events(nb, parent, {
    ...{ name: 'firings', rows: firings, source: 'Rules and board' },
    description: 'Outputs that rules fired, a row for each output of each firing, and shams',
    columns: new Columns(firings)
      .time('timestamp', 'First rise by the board; a sham: decided', sinceBegan(session))
      .time('duration', 'Time on, all pulses together', (f) =>
        f.onUs === null ? null : f.onUs / 1e6,
      )
      .text('rule', 'Rule', (f) => f.rule)
      .text('output', 'Output driven', (f) => f.output)
      .whole('serial', 'Which asking of the rule', (f) => f.serial)
      .flag('sham', '1: sham, nothing was driven', (f) => f.sham)
      .flag('armed', '1: started by the board itself; 0: decided in the host', (f) => f.armed)
      .number('decided', 'Decided or armed, seconds', (f) => (f.decidedUs - session.beganUs) / 1e6)
      .number('latency', 'Rise less decision, seconds; NaN for an armed one', (f) =>
        f.latencyUs === null ? null : f.latencyUs / 1e6,
      )
      .whole('lap', 'Lap', (f) => f.lap)
      .number('speed', 'Speed, metres a second', (f) => metres(f.speedCmPerS))
      .number('place', 'Place intended, metres', (f) => metres(f.placeCm))
      .number('rise', 'Place of the rise, as decided, metres', (f) => metres(f.riseCm))
      .number('rise_uncertainty', 'Half width of rise, metres', (f) => mm(f.decidedUncertaintyMm))
      .number('error', 'Rise less place intended, metres', (f) => mm(f.errorMm))
      .number('corrected', "The rise after the lap's slip, metres", (f) => metres(f.correctedCm))
      .number('corrected_uncertainty', 'Half width of corrected, metres', (f) =>
        mm(f.correctedUncertaintyMm),
      )
      .whole('input', INPUT_MEANING, (f) => f.input),
  });
}

/** What was decided besides firings: what was not done and why, draws, notes, acts. */
export function putDecisions(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const told = toldOf(session);
  events(nb, parent, {
    ...{ name: 'decisions', rows: told, source: 'Rules, board and operator' },
    description: 'What was decided, found or done by a person besides firings, licks, laps, phases',
    columns: new Columns(told)
      .time('timestamp', 'Decided', sinceBegan(session))
      .text('what', 'Kind of decision', (d) => d.kind)
      .text('rule', 'Rule or draw', (d) => d.rule)
      .text('detail', 'Reason, value or text; else its fields as JSON', (d) => d.detail)
      .whole('lap', 'Lap', (d) => d.lap)
      .number('position', 'Place on the belt, metres', (d) => metres(d.positionCm))
      .whole('input', INPUT_MEANING, (d) => d.input),
  });
}

/** Every change of every input line (a frame clock is one), and of the sync line. */
export function putLines(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const { edges } = session;
  const names = [...new Set(edges.map((edge) => edge.name))];
  names.forEach((name, i) => {
    const own = edges.filter((edge) => edge.name === name);
    const plain = `line_${name.replaceAll(/[^A-Za-z0-9_]/g, '_')}`;
    const taken = names.slice(0, i).some((n) => `line_${n.replaceAll(/\W/g, '_')}` === plain);
    events(nb, parent, {
      ...{ name: taken ? `${plain}_${i}` : plain, rows: own, source: `Line ${name} of the board` },
      description: `Changes of the line ${name}, stamped by the board`,
      columns: new Columns(own)
        .time('timestamp', "The board's stamp", sinceBegan(session))
        .flag('level', '1: active from here on', (edge) => edge.level === 1)
        .whole('count', "The encoder's own count", (edge) => edge.count)
        .whole('input', INPUT_MEANING, (edge) => edge.input),
    });
  });
}
