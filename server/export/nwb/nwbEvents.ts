import type { Group } from 'h5wasm/node';
import { type Firing, firingsOf } from '../../analysis/firings.js';
import { dropsOf, lapsOf, licksOf, phasesOf } from '../../analysis/happenings.js';
import type { SessionData } from '../../analysis/readSession.js';
import { countsByLap } from '../tables.js';
import { type ColumnSpec, type NwbBuilder, text } from './hdf5.js';

const f64 = <T>(rows: readonly T[], of: (row: T) => number | null) =>
  Float64Array.from(rows, (row) => of(row) ?? Number.NaN);
const i32 = <T>(rows: readonly T[], of: (row: T) => number) => Int32Array.from(rows, of);
const flag = <T>(rows: readonly T[], of: (row: T) => boolean) =>
  Uint8Array.from(rows, (row) => (of(row) ? 1 : 0));
const metres = (cm: number | null) => (cm === null ? null : cm / 100);

/** A table of events; none where nothing of it happened. */
function events(
  nb: NwbBuilder,
  parent: Group,
  name: string,
  rows: readonly unknown[],
  description: string,
  source: string,
  columns: readonly ColumnSpec[],
): void {
  if (rows.length === 0) return;
  const spec = { type: 'EventsTable' as const, description, rows: rows.length, columns };
  text(nb.table(parent, name, spec), 'source_description', source);
}

export function putLicksAndWater(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const { beganUs } = session;
  const licks = licksOf(session);
  events(nb, parent, 'licks', licks, 'Beginnings of debounced contacts', 'Lick input', [
    {
      ...{ name: 'timestamp', kind: 'timestamp', meaning: 'Contact began' },
      data: f64(licks, (l) => (l.boardUs - beganUs) / 1e6),
    },
    { name: 'lap', data: i32(licks, (l) => l.lap), meaning: 'Lap' },
    {
      ...{ name: 'position', meaning: 'Place on the belt, metres' },
      data: f64(licks, (l) => metres(l.positionCm)),
    },
    {
      ...{
        name: 'artefact',
        meaning: '1: so near to a change of an output that it may be electrical',
      },
      data: flag(licks, (l) => l.artefact),
    },
  ]);
  const drops = dropsOf(session);
  events(nb, parent, 'water', drops, "Drops, by the board's word", 'Valve output', [
    {
      ...{ name: 'timestamp', kind: 'timestamp', meaning: 'The valve opened' },
      data: f64(drops, (d) => (d.boardUs - beganUs) / 1e6),
    },
    {
      ...{ name: 'duration', kind: 'duration', meaning: 'Open for' },
      data: f64(drops, (d) => d.openUs / 1e6),
    },
    { name: 'lap', data: i32(drops, (d) => d.lap), meaning: 'Lap' },
    {
      ...{ name: 'volume', meaning: 'Microlitres, by calibration' },
      data: f64(drops, (d) => d.volumeUl),
    },
    { name: 'rule', data: drops.map((d) => d.rule ?? 'none'), meaning: 'Rule that gave it' },
    {
      ...{ name: 'position', meaning: 'Place on the belt, metres' },
      data: f64(drops, (d) => metres(d.positionCm)),
    },
  ]);
}

/** On and off times of each output that is no valve, and the table of firings. */
export function putStimuli(
  nb: NwbBuilder,
  presentation: Group,
  parent: Group,
  session: SessionData,
): void {
  const { beganUs, rig } = session;
  const firings = firingsOf(session);
  for (const output of rig.outputs) {
    const own = firings.filter((f) => f.output === output.name && f.onUs !== null);
    if (output.kind === 'valve' || own.length === 0) continue;
    const changes = own
      .flatMap((f) => [
        { us: f.boardUs, level: 1 },
        { us: f.boardUs + f.onUs!, level: 0 },
      ])
      .sort((a, b) => a.us - b.us);
    nb.series(presentation, output.name, {
      ...{ data: flag(changes, (c) => c.level === 1), unit: 'n/a', continuity: 'step' },
      timestamps: f64(changes, (c) => (c.us - beganUs) / 1e6),
      description: `Output ${output.name} on (1) and off (0) by the board; a train is its time on`,
    });
  }
  const meters = (name: string, meaning: string, of: (f: Firing) => number | null): ColumnSpec => ({
    ...{ name, meaning: `${meaning}, metres` },
    data: f64(firings, of),
  });
  events(nb, parent, 'firings', firings, 'Outputs that rules fired, and shams', 'Rules and board', [
    {
      ...{
        name: 'timestamp',
        kind: 'timestamp',
        meaning: 'First rise by the board; a sham: decided',
      },
      data: f64(firings, (f) => (f.boardUs - beganUs) / 1e6),
    },
    {
      ...{ name: 'duration', kind: 'duration', meaning: 'Time on, all pulses together' },
      data: f64(firings, (f) => (f.onUs === null ? null : f.onUs / 1e6)),
    },
    { name: 'rule', data: firings.map((f) => f.rule), meaning: 'Rule' },
    { name: 'output', data: firings.map((f) => f.output ?? 'none'), meaning: 'Output driven' },
    { name: 'serial', data: i32(firings, (f) => f.serial), meaning: 'Which asking of the rule' },
    { name: 'sham', data: flag(firings, (f) => f.sham), meaning: '1: sham' },
    {
      name: 'armed',
      data: flag(firings, (f) => f.armed),
      meaning: '1: started by the board itself',
    },
    { name: 'lap', data: i32(firings, (f) => f.lap), meaning: 'Lap' },
    meters('place', 'Place intended', (f) => metres(f.placeCm)),
    meters('rise', 'Place of the rise, as decided', (f) => metres(f.riseCm)),
    meters('corrected', "The rise after the lap's slip", (f) => metres(f.correctedCm)),
  ]);
}

export function putIntervals(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const { beganUs } = session;
  const since = (us: number) => (us - beganUs) / 1e6;
  const laps = lapsOf(session);
  const counts = countsByLap(session);
  const of = (lap: number) => counts.get(lap) ?? { licks: 0, waterUl: 0, firings: 0, shams: 0 };
  if (laps.length > 0)
    nb.table(parent, 'laps', {
      ...{ type: 'TimeIntervals', rows: laps.length },
      description: 'One row a lap; lap 0 is the partial stretch before the first mark',
      columns: [
        { name: 'start_time', data: f64(laps, (l) => since(l.startUs)), meaning: 'Began, s' },
        { name: 'stop_time', data: f64(laps, (l) => since(l.stopUs)), meaning: 'Ended, s' },
        { name: 'lap', data: i32(laps, (l) => l.lap), meaning: 'Lap number' },
        { name: 'complete', data: flag(laps, (l) => l.complete), meaning: '1: the whole belt' },
        { name: 'excluded', data: flag(laps, (l) => l.excluded), meaning: '1: to be left out' },
        { name: 'phase', data: laps.map((l) => l.phase ?? 'none'), meaning: 'Phase at its start' },
        { name: 'cell', data: i32(laps, (l) => l.cell), meaning: 'Cell, from 1' },
        { name: 'slip', data: f64(laps, (l) => l.slipMm), meaning: 'Slip at its end, mm' },
        { name: 'licks', data: i32(laps, (l) => of(l.lap).licks), meaning: 'Licks' },
        { name: 'water', data: f64(laps, (l) => of(l.lap).waterUl), meaning: 'Microlitres given' },
        { name: 'firings', data: i32(laps, (l) => of(l.lap).firings), meaning: 'Outputs fired' },
        { name: 'shams', data: i32(laps, (l) => of(l.lap).shams), meaning: 'Shams' },
      ],
    });
  const phases = phasesOf(session);
  if (phases.length === 0) return;
  nb.table(parent, 'phases', {
    ...{ type: 'TimeIntervals', rows: phases.length, description: 'Phases of the rules file' },
    columns: [
      { name: 'start_time', data: f64(phases, (p) => since(p.startUs)), meaning: 'Began, s' },
      { name: 'stop_time', data: f64(phases, (p) => since(p.stopUs)), meaning: 'Ended, s' },
      { name: 'phase', data: phases.map((p) => p.phase), meaning: 'Name' },
      { name: 'reason', data: phases.map((p) => p.reason || 'none'), meaning: 'Why it began' },
    ],
  });
}

/** What was not done and why, draws and notes; and every change of every input. */
export function putRest(nb: NwbBuilder, parent: Group, session: SessionData): void {
  const { beganUs, decisions, edges } = session;
  const told = decisions.flatMap((d) => {
    const at = (what: string, rule: string, detail: string) => [{ ...d, what, rule, detail }];
    switch (d.kind) {
      case 'withheld':
      case 'missed':
      case 'refused':
      case 'uncertain':
        return at(d.kind, d.rule, d.reason);
      case 'drawn':
        return at(d.kind, d.draw, String(d.value));
      case 'note':
        return at(d.kind, '', d.text);
      case 'operator':
        return at(d.kind, '', JSON.stringify(d.act));
      case 'trust':
        return at(d.kind, '', `${d.trust}: ${d.reason}`);
      default:
        return [];
    }
  });
  events(nb, parent, 'decisions', told, 'What was decided besides firings', 'Rules and operator', [
    {
      ...{ name: 'timestamp', kind: 'timestamp', meaning: 'Decided' },
      data: f64(told, (d) => (d.boardUs - beganUs) / 1e6),
    },
    { name: 'what', data: told.map((d) => d.what), meaning: 'Kind of decision' },
    { name: 'rule', data: told.map((d) => d.rule || 'none'), meaning: 'Rule or draw' },
    { name: 'detail', data: told.map((d) => d.detail || 'none'), meaning: 'Reason, value, text' },
    {
      name: 'input',
      data: i32(told, (d) => d.input),
      meaning: 'Input of the record that caused it',
    },
    { name: 'lap', data: i32(told, (d) => d.lap), meaning: 'Lap' },
  ]);
  for (const name of new Set(edges.map((edge) => edge.name))) {
    const own = edges.filter((edge) => edge.name === name);
    const label = `line_${name.replaceAll(/[^A-Za-z0-9_]/g, '_')}`;
    events(nb, parent, label, own, `Changes of the line ${name}`, `Line ${name} of the board`, [
      {
        ...{ name: 'timestamp', kind: 'timestamp', meaning: "The board's stamp" },
        data: f64(own, (edge) => (edge.boardUs - beganUs) / 1e6),
      },
      {
        name: 'level',
        data: flag(own, (edge) => edge.level === 1),
        meaning: '1: active from here on',
      },
    ]);
  }
}
