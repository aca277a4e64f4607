import { readFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import type { Alignment } from '../analysis/align/align.js';
import { alignSession } from '../analysis/align/alignSession.js';
import { type EdgeFileOptions, readEdges } from '../analysis/align/readEdges.js';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { derivedFolder } from '../export/exportFolder.js';
import { csvLine, fixed } from '../export/table.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { progressBar } from './progressBar.js';

interface AlignFlags {
  line?: string;
  column?: string;
  rate?: number;
  json?: boolean;
}

/** `lapwing align SESSION EDGES`: the session's events in another instrument's time. */
export function alignCommand(): Command {
  return new Command('align')
    .description("put a session's events on the clock of an amplifier or a microscope")
    .argument('<session>', 'the session folder')
    .argument('<edges>', 'edge times that the other instrument recorded: a column, or CSV')
    .option('--line <name>', 'the line recorded: an input or output of the rig; else the sync line')
    .option('--column <name>', 'the column of the CSV that holds the times')
    .option('--rate <hz>', 'the times are samples at this rate', rate)
    .option('--json', 'print the result as JSON')
    .action(async (folder: string, edges: string, flags: AlignFlags) => {
      const acquisitions = readEdges(textOf(edges), options(flags));
      const bar = progressBar('reading');
      const session = await readSession(folder, (done) => bar.show(done));
      bar.clear();
      const {
        line,
        edges: own,
        good,
        refused,
        events,
      } = alignSession(session, acquisitions, flags.line);
      const derived = derivedFolder(folder);
      const table = join(derived, 'aligned-events.csv');
      const fitted = join(derived, 'alignment.json');
      writeFileWhole(table, eventTable(events));
      const result = { line, edges: own, alignments: good, refused };
      writeFileWhole(fitted, `${JSON.stringify(result, null, 1)}\n`);
      if (flags.json) {
        const brief = good.map(({ knots: _, ...rest }) => rest);
        const out = { line, edges: own, alignments: brief, refused, events: table, fit: fitted };
        process.stdout.write(`${JSON.stringify(out, null, 2)}\n`);
        return;
      }
      const lines = [
        `${own} rises of ${line} in the record`,
        ...good.flatMap(inWords),
        ...refused.map((r) => `acquisition ${r.acquisition}: refused: ${r.refused}`),
        ...[table, fitted],
      ];
      process.stdout.write(`${lines.join('\n')}\n`);
    });
}

function rate(text: string): number {
  const value = Number(text);
  if (value > 0 && Number.isFinite(value)) return value;
  throw new InvalidArgumentError('expected samples a second, such as 30000');
}

function options({ column, rate: rateHz }: AlignFlags): EdgeFileOptions {
  return {
    ...(column === undefined ? {} : { column }),
    ...(rateHz === undefined ? {} : { rateHz }),
  };
}

function textOf(file: string): string {
  try {
    return readFileSync(resolve(file), 'utf8');
  } catch (error) {
    throw new LapwingError('alignEdgesBad', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

function eventTable(events: ReturnType<typeof alignSession>['events']): string {
  const places = ['lap', 'position_cm', 'input'];
  const head = ['kind', 'name', 'session_s', 'other_s', 'acquisition', ...places];
  const rows = events.map((event) =>
    csvLine([
      ...[event.kind, event.name, fixed(event.sessionS, 6), fixed(event.otherS, 6)],
      ...[String(event.acquisition ?? ''), String(event.lap), fixed(event.positionCm, 4)],
      String(event.input),
    ]),
  );
  return csvLine(head) + rows.join('');
}

function inWords(a: Alignment): string[] {
  const us = ({ median, p99, max }: Alignment['residualsUs']) =>
    `median ${median.toFixed(1)}, p99 ${p99.toFixed(1)}, max ${max.toFixed(1)} us`;
  return [
    `acquisition ${a.acquisition}: ${a.matched} of ${a.edges} edges matched by ${a.method}, ` +
      `session ${a.fromS.toFixed(3)} to ${a.toS.toFixed(3)} s`,
    `  offset ${a.offsetS.toFixed(6)} s, drift ${a.driftPpm.toFixed(3)} ppm`,
    `  from the line: ${us(a.lineResidualsUs)}`,
    `  from the curve that events follow: ${us(a.residualsUs)}`,
  ];
}
