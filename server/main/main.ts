#!/usr/bin/env node
/** The command line: the one place that names every command. */
import { Command } from 'commander';
import { packageVersion } from '../packageRoot.js';
import { alignCommand } from './align.js';
import { animalCommand } from './animal.js';
import { animalsCommand } from './animals/animals.js';
import { correctCommand } from './animals/correct.js';
import { waterCommand } from './animals/water.js';
import { weighCommand } from './animals/weigh.js';
import { sealCommand } from './blinding/seal.js';
import { unblindCommand } from './blinding/unblind.js';
import { calibrateCommand } from './calibrate.js';
import { checkCommand } from './check.js';
import { demoCommand } from './demo.js';
import { explainCommand } from './explain.js';
import { exportCommand } from './export.js';
import { flashCommand } from './flash.js';
import { mendCommand } from './mend.js';
import { peopleCommand } from './people.js';
import { planCommand } from './plan.js';
import { portsCommand } from './ports.js';
import { preflightCommand } from './preflight.js';
import { quietCommand } from './quiet.js';
import { rehearseCommand } from './rehearse.js';
import { replayCommand } from './replay.js';
import { reportCommand } from './report.js';
import { resumeCommand } from './resume.js';
import { runCommand } from './run.js';
import { selftestCommand } from './selftest.js';
import { serveCommand } from './serve.js';
import { tellError } from './tellError.js';

const program = new Command('lapwing')
  .description('Closed-loop triggers for a belt-treadmill rig. Not a safety interlock.')
  .version(packageVersion)
  // A command within a command (`water give`) has options of its own.
  .enablePositionalOptions()
  .addCommand(demoCommand())
  .addCommand(serveCommand())
  .addCommand(peopleCommand())
  .addCommand(runCommand())
  .addCommand(resumeCommand())
  .addCommand(rehearseCommand())
  .addCommand(checkCommand())
  .addCommand(explainCommand())
  .addCommand(replayCommand())
  .addCommand(mendCommand())
  .addCommand(exportCommand())
  .addCommand(alignCommand())
  .addCommand(reportCommand())
  .addCommand(animalCommand())
  .addCommand(planCommand())
  .addCommand(animalsCommand())
  .addCommand(weighCommand())
  .addCommand(waterCommand())
  .addCommand(correctCommand())
  .addCommand(sealCommand())
  .addCommand(unblindCommand())
  .addCommand(calibrateCommand())
  .addCommand(preflightCommand())
  .addCommand(portsCommand())
  .addCommand(selftestCommand())
  .addCommand(flashCommand())
  .addCommand(quietCommand());

// A reader that closes early (`lapwing explain FILE | head`) is no error.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(0);
  throw error;
});

program.parseAsync().catch((error: unknown) => {
  tellError(error);
  process.exitCode = 1;
});
