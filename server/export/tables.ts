import { firingsOf } from '../analysis/firings.js';
import { dropsOf, lapsOf, licksOf, phasesOf } from '../analysis/happenings.js';
import { countsByLap } from '../analysis/lapCounts.js';
import type { SessionData } from '../analysis/readSession.js';
import { TRUSTS } from '../analysis/sampleColumns.js';
import { toldOf } from '../analysis/told.js';
import { type Column, fixed, seconds, type Table, yes } from './table.js';

const time = (name: string, meaning: string): Column => ({
  ...{ name, type: 'number', unit: 's', meaning: `${meaning}; since the session began` },
});
const column = (name: string, type: Column['type'], unit: string, meaning: string): Column => ({
  ...{ name, type, unit, meaning },
});
const INPUT = column('input', 'integer', '', 'number of the input in the record that it came from');
const LAP = column('lap', 'integer', '', 'lap number; 0 before the first mark, place unknown');
const POSITION = column('position_cm', 'number', 'cm', 'along the belt from 0 cm');
const SPEED = column('speed_cm_per_s', 'number', 'cm/s', "over the rig file's window; signed");

/** The session's tables, in the order in which they are explained. */
export function tablesOf(session: SessionData): Table[] {
  const all = [laps, licks, firings, water, phases, decisions, inputs, samples];
  return all.map((make) => make(session));
}

function laps(session: SessionData): Table {
  const since = (us: number) => seconds(us - session.beganUs);
  const countsOf = countsByLap(session);
  return {
    name: 'laps',
    meaning: 'one row a lap, from its 0 cm to the next; row 0 is the partial stretch before it',
    columns: [
      LAP,
      time('start_s', 'the lap began'),
      time('stop_s', 'it ended'),
      column('complete', 'yes/no', '', '0 for lap 0 and for a lap that the end cut short'),
      column('excluded', 'yes/no', '', '1: the operator said to leave this lap out'),
      column('cell', 'integer', '', 'which cell of the session, from 1'),
      column('phase', 'text', '', 'phase in force as the lap began'),
      column('slip_mm', 'number', 'mm', "encoder's place less the mark's at the lap's end"),
      column('licks', 'integer', '', 'licks, possible artefacts left out'),
      column('water_ul', 'number', 'uL', 'given'),
      column('firings', 'integer', '', 'outputs fired, shams left out'),
      column('shams', 'integer', '', 'shams'),
      INPUT,
    ],
    rows: lapsOf(session).map((lap) => {
      const counts = countsOf(lap.lap);
      return [
        ...[String(lap.lap), since(lap.startUs), since(lap.stopUs), yes(lap.complete)],
        ...[yes(lap.excluded), String(lap.cell), lap.phase ?? '', fixed(lap.slipMm, 3)],
        ...[String(counts.licks), fixed(counts.waterUl, 3)],
        ...[String(counts.firings), String(counts.shams), String(lap.input)],
      ];
    }),
  };
}

function licks(session: SessionData): Table {
  return {
    name: 'licks',
    meaning: 'one row a lick: the beginning of a debounced contact with the spout',
    columns: [
      time('time_s', 'contact began'),
      LAP,
      POSITION,
      SPEED,
      column('artefact', 'yes/no', '', '1: within some ms of an output, may be electrical'),
      INPUT,
    ],
    rows: licksOf(session).map((lick) => [
      ...[seconds(lick.boardUs - session.beganUs), String(lick.lap), fixed(lick.positionCm, 4)],
      ...[fixed(lick.speedCmPerS, 3), yes(lick.artefact), String(lick.input)],
    ]),
  };
}

function firings(session: SessionData): Table {
  const since = (us: number) => seconds(us - session.beganUs);
  return {
    name: 'firings',
    meaning: 'one row for each output of each firing, and one for each sham',
    columns: [
      column('rule', 'text', '', 'the rule that fired'),
      column('serial', 'integer', '', 'which asking of the rule; outputs of one firing share it'),
      column('sham', 'yes/no', '', '1: decided and withheld on purpose, nothing was driven'),
      column('armed', 'yes/no', '', '1: started by the board at the place; 0: by the host'),
      column('output', 'text', '', 'the output that was driven'),
      LAP,
      time('decided_s', 'the rules decided, or armed the board'),
      time('rise_s', 'first rise, by the board; a sham: its moment'),
      column('on_s', 'number', 's', 'time on, all pulses together, by the board'),
      column('latency_s', 'number', 's', 'rise less decision; empty for an armed firing'),
      SPEED,
      column('place_cm', 'number', 'cm', 'the place intended'),
      column('rise_cm', 'number', 'cm', 'where the rise was, by the counts of that moment'),
      column('error_mm', 'number', 'mm', 'rise less place intended'),
      column('corrected_cm', 'number', 'cm', "the rise, the lap's slip shared out over the lap"),
      column('decided_uncertainty_mm', 'number', 'mm', 'half width of rise_cm'),
      column('corrected_uncertainty_mm', 'number', 'mm', 'half width of corrected_cm'),
      INPUT,
    ],
    rows: firingsOf(session).map((f) => [
      ...[f.rule, String(f.serial), yes(f.sham), yes(f.armed), f.output ?? '', String(f.lap)],
      ...[since(f.decidedUs), since(f.boardUs), seconds(f.onUs), seconds(f.latencyUs)],
      ...[fixed(f.speedCmPerS, 3), fixed(f.placeCm, 4), fixed(f.riseCm, 4), fixed(f.errorMm, 3)],
      ...[fixed(f.correctedCm, 4), fixed(f.decidedUncertaintyMm, 3)],
      ...[fixed(f.correctedUncertaintyMm, 3), String(f.input)],
    ]),
  };
}

function water(session: SessionData): Table {
  return {
    name: 'water',
    meaning: "one row a drop, by the board's word",
    columns: [
      time('time_s', 'the valve opened'),
      column('open_s', 'number', 's', 'for so long'),
      column('volume_ul', 'number', 'uL', 'by the calibration in the rig file'),
      column('output', 'text', '', 'the valve'),
      column('rule', 'text', '', 'that gave it; empty where no command of the record did'),
      LAP,
      POSITION,
      INPUT,
    ],
    rows: dropsOf(session).map((drop) => [
      ...[seconds(drop.boardUs - session.beganUs), seconds(drop.openUs), fixed(drop.volumeUl, 3)],
      ...[drop.output, drop.rule ?? '', String(drop.lap), fixed(drop.positionCm, 4)],
      String(drop.input),
    ]),
  };
}

function phases(session: SessionData): Table {
  return {
    name: 'phases',
    meaning: 'one row a phase, as often as it began',
    columns: [
      column('phase', 'text', '', 'its name in the rules file'),
      time('start_s', 'it began'),
      time('stop_s', 'it ended'),
      column('lap', 'integer', '', 'lap in which it began'),
      column('reason', 'text', '', 'why it began'),
      INPUT,
    ],
    rows: phasesOf(session).map((span) => [
      ...[span.phase, seconds(span.startUs - session.beganUs)],
      ...[seconds(span.stopUs - session.beganUs), String(span.lap), span.reason],
      String(span.input),
    ]),
  };
}

function decisions(session: SessionData): Table {
  return {
    name: 'decisions',
    meaning: 'one row for everything else that was decided, found or done by a person',
    columns: [
      time('time_s', 'when'),
      column(
        'kind',
        'text',
        '',
        'withheld, missed, refused, uncertain, drawn, note, operator, ...',
      ),
      column('rule', 'text', '', 'the rule or draw; empty where it is of none'),
      column('detail', 'text', '', 'why or what: reason, value, text; else its fields as JSON'),
      LAP,
      POSITION,
      INPUT,
    ],
    rows: toldOf(session).map((told) => [
      ...[seconds(told.boardUs - session.beganUs), told.kind, told.rule, told.detail],
      ...[String(told.lap), fixed(told.positionCm, 4), String(told.input)],
    ]),
  };
}

function inputs(session: SessionData): Table {
  return {
    name: 'inputs',
    meaning: 'one row for each change of an input line, and of the sync line',
    columns: [
      time('time_s', "the board's stamp of the change"),
      column('line', 'text', '', 'name in the rig file'),
      column('level', 'integer', '', '1: active from here on, 0: no longer'),
      column('count', 'integer', 'counts', "the encoder's own count"),
      INPUT,
    ],
    rows: session.edges.map((edge) => [
      ...[seconds(edge.boardUs - session.beganUs), edge.name],
      ...[String(edge.level), String(edge.count), String(edge.input)],
    ]),
  };
}

function samples(session: SessionData): Table {
  return {
    name: 'samples',
    meaning: 'one row a sample: up to 1000 a second while something changes, 200 at rest',
    columns: [
      time('time_s', "the board's stamp"),
      column('count', 'integer', 'counts', "the encoder's own count"),
      POSITION,
      SPEED,
      LAP,
      column('trust', 'text', '', 'how far to trust position: unknown, doubtful, trusted'),
      column('inputs', 'integer', '', 'input levels, bit n for line n'),
      column('outputs', 'integer', '', 'outputs on, bit n for line n'),
      INPUT,
    ],
    rows: sampleRows(session),
  };
}

function* sampleRows({ samples: s, beganUs }: SessionData): Generator<string[]> {
  for (let i = 0; i < s.length; i++) {
    yield [
      ...[seconds(s.boardUs[i]! - beganUs), String(s.count[i]), fixed(s.positionCm[i]!, 4)],
      ...[fixed(s.speedCmPerS[i]!, 3), String(s.lap[i]), TRUSTS[s.trust[i]!]!],
      ...[String(s.inputs[i]), String(s.outputs[i]), String(s.input[i])],
    ];
  }
}
