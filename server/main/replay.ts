import { resolve } from 'node:path';
import { Command } from 'commander';
import { needArm, refuseSealed } from '../session/blinding/arms.js';
import { loadSession } from '../session/loadSession.js';
import { describeTroubles } from '../session/record/recordState.js';
import { type ReplayResult, replaySession } from '../session/replay.js';
import { type FiringCompared, type FiringSeen, type WhatIf, whatIf } from '../session/whatIf.js';
import { SimulatedLedBoard } from './ledBoard.js';
import { progressBar } from './progressBar.js';

/**
 * `lapwing replay SESSION`: the record through the engine again, every decision compared.
 * `--rules OTHER`: what another rules file would have done, firing by firing.
 */
export function replayCommand(): Command {
  return new Command('replay')
    .description("feed a session's record through the engine again and compare every decision")
    .argument('<session>', 'the session folder')
    .option('--rules <file>', 'what this rules file would have done, firing by firing')
    .option('--json', 'print the result as JSON')
    .action(async (folder: string, flags: { json?: boolean; rules?: string }) => {
      const bar = progressBar('replaying');
      const { setup, description } = loadSession(folder);
      const { blinding } = description;
      needArm(blinding, setup.arm);
      const most = description.record?.lastInput ?? Number.POSITIVE_INFINITY;
      const show = (inputs: number) => bar.show(Math.min(1, inputs / most));
      if (flags.rules !== undefined) {
        refuseSealed(blinding, 'Another rules file compared with this one');
        const other = loadSession(folder, resolve(flags.rules));
        const found = await whatIf(other, (hear) => new SimulatedLedBoard(hear), show);
        bar.clear();
        print(flags.json ? JSON.stringify(found, null, 2) : whatIfInWords(found));
        return;
      }
      const result = await replaySession(folder, setup, show);
      bar.clear();
      if (result.difference !== null) refuseSealed(blinding, 'The first difference');
      print(flags.json ? JSON.stringify(result, null, 2) : inWords(result));
      if (result.difference !== null || result.state.state === 'damaged') process.exitCode = 1;
    });
}

function print(text: string): void {
  process.stdout.write(`${text}\n`);
}

function inWords({ inputs, decisions, commands, difference, state }: ReplayResult): string {
  const lines = describeTroubles(state).map((trouble) => `record: ${trouble}`);
  const compared = `${inputs} inputs, ${decisions} decisions and ${commands} commands compared`;
  if (difference === null) return [...lines, `identical: ${compared}`].join('\n');
  const { input, recorded, replayed } = difference;
  return [
    ...lines,
    `different at input ${input} (${compared})`,
    `  the record says: ${recorded ?? 'nothing'}`,
    `  the replay says: ${replayed ?? 'nothing'}`,
  ].join('\n');
}

function whatIfInWords({ rows, counts }: WhatIf): string {
  const totals = Object.entries(counts).filter(([, count]) => count > 0);
  return [
    ...rows.map(rowInWords),
    totals.map(([verdict, count]) => `${count} ${verdict}`).join(', ') || 'no firing in either',
    "the belt's movement, licks and operator acts are the record's: an animal that was given " +
      'something else might have moved otherwise',
  ].join('\n');
}

function rowInWords({ rule, output, lap, recorded, other, verdict, reason }: FiringCompared) {
  const where = `lap ${lap} ${rule}${output === null ? '' : ` (${output})`}`;
  const why = reason === null ? '' : `; ${reason}`;
  return `${where}: ${seen(recorded)} -> ${seen(other)}: ${verdict}${why}`;
}

function seen(firing: FiringSeen | null): string {
  if (firing === null) return 'nothing';
  const { timeS, positionCm, sham } = firing;
  const at = positionCm === null ? 'at an unknown place' : `at ${positionCm.toFixed(2)} cm`;
  return `${sham ? 'sham ' : ''}${at}, ${timeS.toFixed(3)} s`;
}
