#!/usr/bin/env node
/** The command line: the one place that names every command. */
import { Command } from 'commander';
import { packageVersion } from '../packageRoot.js';
import { tellError } from './tellError.js';

/** In the order of the help. Each is loaded when it is asked for, so that `quiet` does not wait for all. */
const COMMANDS: Readonly<Record<string, () => Promise<Command>>> = {
  demo: async () => (await import('./demo.js')).demoCommand(),
  serve: async () => (await import('./serve.js')).serveCommand(),
  people: async () => (await import('./people.js')).peopleCommand(),
  run: async () => (await import('./run.js')).runCommand(),
  resume: async () => (await import('./resume.js')).resumeCommand(),
  rehearse: async () => (await import('./rehearse.js')).rehearseCommand(),
  check: async () => (await import('./check.js')).checkCommand(),
  explain: async () => (await import('./explain.js')).explainCommand(),
  replay: async () => (await import('./replay.js')).replayCommand(),
  mend: async () => (await import('./mend.js')).mendCommand(),
  export: async () => (await import('./export.js')).exportCommand(),
  align: async () => (await import('./align.js')).alignCommand(),
  report: async () => (await import('./report.js')).reportCommand(),
  animal: async () => (await import('./animal.js')).animalCommand(),
  plan: async () => (await import('./plan.js')).planCommand(),
  animals: async () => (await import('./animals/animals.js')).animalsCommand(),
  weigh: async () => (await import('./animals/weigh.js')).weighCommand(),
  water: async () => (await import('./animals/water.js')).waterCommand(),
  correct: async () => (await import('./animals/correct.js')).correctCommand(),
  seal: async () => (await import('./blinding/seal.js')).sealCommand(),
  unblind: async () => (await import('./blinding/unblind.js')).unblindCommand(),
  calibrate: async () => (await import('./calibrate.js')).calibrateCommand(),
  preflight: async () => (await import('./preflight.js')).preflightCommand(),
  ports: async () => (await import('./ports.js')).portsCommand(),
  selftest: async () => (await import('./selftest.js')).selftestCommand(),
  flash: async () => (await import('./flash.js')).flashCommand(),
  quiet: async () => (await import('./quiet.js')).quietCommand(),
};

const program = new Command('lapwing')
  .description('Closed-loop triggers for a belt-treadmill rig. Not a safety interlock.')
  .version(packageVersion)
  // A command within a command (`water give`) has options of its own.
  .enablePositionalOptions();

// A reader that closes early (`lapwing explain FILE | head`) is no error.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(0);
  throw error;
});

async function run(): Promise<void> {
  const [, , asked = ''] = process.argv;
  const one = Object.hasOwn(COMMANDS, asked) ? COMMANDS[asked] : undefined;
  const isVersion = asked === '-V' || asked === '--version';
  // Help, and what is misspelt, need them all.
  const needed = one ? [one] : isVersion ? [] : Object.values(COMMANDS);
  for (const load of needed) program.addCommand(await load());
  await program.parseAsync();
}

run().catch((error: unknown) => {
  tellError(error);
  process.exitCode = 1;
});
