import { resolve } from 'node:path';
import { Command } from 'commander';
import { ANIMAL, PARAMETERS } from '../../hardware-sim/animal/parameters.js';
import { readSession } from '../analysis/readSession.js';
import { LapwingError } from '../errors/codes.js';
import { amountText, animalText, USUAL_HEAD } from '../rehearse/animalFile.js';
import { type Estimate, estimate } from '../rehearse/fit/estimate.js';
import { type Observed, observe } from '../rehearse/fit/observe.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { progressBar } from './progressBar.js';

interface FitFlags {
  name: string;
  to?: string;
  json?: boolean;
}

/** `lapwing animal show` and `lapwing animal fit RECORDS`: the simulated animal's file. */
export function animalCommand(): Command {
  return new Command('animal')
    .description('the simulated animal of rehearsals: its parameters, usual or fitted to sessions')
    .addCommand(showCommand())
    .addCommand(fitCommand());
}

function showCommand(): Command {
  return new Command('show')
    .description('print the usual animal as a file, with every parameter, its unit and its meaning')
    .action(() => {
      process.stdout.write(animalText({ name: 'usual', parameters: ANIMAL }, USUAL_HEAD));
    });
}

function fitCommand(): Command {
  return new Command('fit')
    .description('make an animal file from real sessions, for `lapwing rehearse --animal`')
    .argument('<records...>', 'session folders; several animals and days are best')
    .option('--name <text>', 'what the animal is called', 'fitted')
    .option('--to <file>', 'write it there instead of printing it')
    .option('--json', 'print the estimates as JSON, each with its number and its estimator')
    .addHelpText('after', HELP)
    .action(async (folders: string[], flags: FitFlags) => {
      const sessions = await observeAll([...new Set(folders.map((folder) => resolve(folder)))]);
      const found = estimate(sessions);
      if (found.length === 0) throw tooLittle(sessions);
      if (flags.json) {
        process.stdout.write(`${JSON.stringify(asJson(sessions, found), null, 2)}\n`);
        return;
      }
      const parameters = { ...ANIMAL };
      for (const { key, value } of found) Object.assign(parameters, { [key]: value });
      const text = animalText({ name: flags.name, parameters }, head(sessions, found));
      if (flags.to === undefined) process.stdout.write(text);
      else {
        writeFileWhole(resolve(flags.to), text);
        process.stdout.write(`${flags.to}: ${found.length} of ${ALL} parameters fitted\n`);
      }
    });
}

const ALL = Object.keys(PARAMETERS).length;
const HELP = `
Medians and quantiles, so that odd laps move little. What sessions show too seldom stays as usual; the
file says which. Sessions that began naive give learning, four animals or more how animals differ.`;

async function observeAll(folders: readonly string[]): Promise<Observed[]> {
  const bar = progressBar('reading records');
  const sessions: Observed[] = [];
  try {
    for (const [n, folder] of folders.entries()) {
      const session = await readSession(folder, (done) => bar.show((n + done) / folders.length));
      sessions.push(observe(session, ANIMAL.quenchedUl));
    }
  } finally {
    bar.clear();
  }
  return sessions;
}

function tooLittle(sessions: readonly Observed[]): LapwingError {
  const minutes = sessions.reduce((sum, session) => sum + session.minutes, 0);
  return new LapwingError(
    'planTooFew',
    `${sessions.length} sessions of ${minutes.toFixed(1)} minutes in all show too few bouts and laps.`,
  );
}

/** Comment lines: from what, and which parameters are no estimates. */
function head(sessions: readonly Observed[], found: readonly Estimate[]): string[] {
  const minutes = sessions.reduce((sum, session) => sum + session.minutes, 0);
  const animals = new Set(sessions.map(({ subject }) => subject)).size;
  const kept = Object.entries(PARAMETERS).filter(([key]) => !found.some((one) => one.key === key));
  return [
    `Fitted by \`lapwing animal fit\` to ${sessions.length} sessions of ${animals} animals, ${minutes.toFixed(0)} min in all.`,
    ...found.map(({ key, n, how }) => `  ${PARAMETERS[key].name}: n = ${n}, ${how}`),
    `As usual, not fitted: ${kept.map(([, { name }]) => name).join(', ')}.`,
  ];
}

function asJson(sessions: readonly Observed[], found: readonly Estimate[]): object {
  return {
    sessions: sessions.map(({ name, subject, minutes }) => ({ name, subject, minutes })),
    parameters: Object.fromEntries(
      found.map(({ key, value, n, how }) => {
        const parameter = PARAMETERS[key];
        return [parameter.name, { value: amountText(parameter, value), n, how }];
      }),
    ),
  };
}
