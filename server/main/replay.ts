import { join } from 'node:path';
import { Command } from 'commander';
import { readDescription } from '../session/description.js';
import { prepareRules } from '../session/prepare.js';
import { describeTroubles } from '../session/record/recordState.js';
import { type ReplayResult, replaySession } from '../session/replay.js';
import { readRig } from '../session/rig/readRig.js';

/** `lapwing replay SESSION`: the record through the engine again, every decision compared. */
export function replayCommand(): Command {
  return new Command('replay')
    .description("feed a session's record through the engine again and compare every decision")
    .argument('<session>', 'the session folder')
    .option('--json', 'print the result as JSON')
    .action(async (folder: string, flags: { json?: boolean }) => {
      const { seed, waterEarlierUl } = readDescription(folder);
      const rig = readRig(join(folder, 'rig.yaml'));
      const { program, file } = prepareRules(join(folder, 'rules.yaml'), rig);
      const waterTodayNl = (waterEarlierUl ?? 0) * 1_000;
      const setup = { rig, program, title: file.title, seed, waterTodayNl };
      const result = await replaySession(folder, setup);
      const text = flags.json ? JSON.stringify(result, null, 2) : inWords(result);
      process.stdout.write(`${text}\n`);
      if (result.difference !== null || result.state.state === 'damaged') process.exitCode = 1;
    });
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
