import { resolve } from 'node:path';
import { Command } from 'commander';
import type { Draft } from '../calibrate/guides/guide.js';
import { type GuideName, runGuide } from '../calibrate/guides/runGuide.js';
import { lickFromSession } from '../calibrate/lick/fromSession.js';
import { keepCalibration, useCalibration } from '../calibrate/store.js';
import { LapwingError } from '../errors/codes.js';
import { readDescription } from '../session/description.js';
import { ageDays, type Calibration, isOld, listCalibrations } from '../session/rig/calibration.js';
import { readRig } from '../session/rig/readRig.js';
import { answersOption, loginName, rigOption } from './arguments.js';
import { TerminalDesk } from './terminalDesk.js';
import { textPicture } from './textPictures.js';
import { withBench } from './withBench.js';

interface Flags {
  rig: string;
  by: string;
  answer: Record<string, string>;
  yes?: boolean;
  use?: boolean;
  json?: boolean;
  check?: boolean;
  session?: string;
}

/** `lapwing calibrate`: belt, valve, lick sensor and latency, measured under guidance and kept. */
export function calibrateCommand(): Command {
  const command = new Command('calibrate').description(
    'measure belt, valve, lick sensor and latency, and keep the results for the rig file',
  );
  command.addCommand(
    guide('belt', 'turn the belt by hand past its mark').action((flags: Flags) =>
      calibrate('belt', '', flags),
    ),
  );
  command.addCommand(
    guide('valve', 'weigh drops of a few open times; no animal on the rig')
      .argument('[output]', 'the valve, by its name in the rig file', '')
      .option('--check', 'the weekly check: one open time against the calibration in force')
      .action((output: string, flags: Flags) =>
        calibrate(flags.check ? 'valve check' : 'valve', output, flags),
      ),
  );
  command.addCommand(
    guide('lick', 'watch live licking: lockout, limits, echoes of outputs')
      .option('--session <folder>', 'from the record of a session instead, without the rig')
      .action((flags: Flags) =>
        flags.session === undefined ? calibrate('lick', '', flags) : fromSession(flags),
      ),
  );
  command.addCommand(
    guide('latency', 'time the way to the board and back, stalls, and outputs by a wire').action(
      (flags: Flags) => calibrate('latency', '', flags),
    ),
  );
  command.addCommand(
    new Command('list')
      .description('the calibrations of a rig, their ages, and which are in force')
      .addOption(rigOption())
      .option('--json', 'print JSON instead of words')
      .action(list),
  );
  command.addCommand(
    new Command('use')
      .description('put a kept calibration in force: the rig file refers to it from now on')
      .argument('<name>', 'its name, as `lapwing calibrate list` shows it')
      .addOption(rigOption())
      .action(use),
  );
  return command;
}

function guide(name: string, description: string): Command {
  return new Command(name)
    .description(description)
    .addOption(rigOption())
    .option('--by <name>', 'who measures', loginName())
    .addOption(answersOption('laps=20 celsius=22.5'))
    .option('--yes', 'ask nothing and take what is offered, as on the simulated rig')
    .option('--use', 'put the result in force in the rig file')
    .option('--json', 'print the result as JSON');
}

async function calibrate(name: GuideName, of: string, flags: Flags): Promise<void> {
  const rig = readRig(flags.rig);
  const valve = of || (rig.outputs.find(({ kind }) => kind === 'valve')?.name ?? '');
  const { draft, kept } = await withBench(rig, flags.rig, async ({ bench, hands, signal }) => {
    const desk = new TerminalDesk({
      ...{ rig, bench, signal, hands: hands?.say, by: flags.by, given: flags.answer },
      ...{ yes: flags.yes === true, silent: flags.json === true },
    });
    const result = await runGuide(desk, name, valve);
    // A loop that goes on reads the rig file again.
    if (flags.use && result.kept !== undefined) {
      useCalibration(flags.rig, result.kept);
      await bench.reload();
    }
    return result;
  });
  tell(draft, kept, flags);
}

/** From what a session recorded: its own rig file says which input is the sensor. */
async function fromSession(flags: Flags): Promise<void> {
  const rig = readRig(flags.rig);
  const folder = resolve(flags.session!);
  const draft = await lickFromSession(folder, rig);
  const { board } = readDescription(folder);
  const made = board ?? { model: '', boardId: 0, firmware: 0, simulated: false };
  const kept = keepCalibration(rig, draft, made, flags.by, new Date());
  if (!flags.json) tellDraft(draft);
  if (flags.use) useCalibration(flags.rig, kept);
  tell(draft, kept, flags);
}

function tellDraft({ says, warnings, pictures }: Draft): void {
  for (const picture of pictures) process.stderr.write(`\n${textPicture(picture).join('\n')}\n`);
  process.stderr.write(`\n${[...says, ...warnings.map((one) => `Look: ${one}`)].join('\n')}\n`);
}

function tell(draft: Draft, kept: Calibration | undefined, flags: Flags): void {
  const alarm = draft.values.verdict === 'alarm';
  if (alarm) process.exitCode = 1;
  if (flags.json) {
    const { says, warnings } = draft;
    process.stdout.write(
      `${JSON.stringify({ calibration: kept ?? null, says, warnings }, null, 2)}\n`,
    );
    return;
  }
  if (kept === undefined) {
    process.stdout.write('nothing was kept\n');
    return;
  }
  process.stdout.write(`kept as ${kept.name}\n`);
  if (!draft.usable) return;
  const how = flags.use
    ? `${flags.rig} refers to it now; the file as it was is beside it as .bak`
    : `in force once the rig file refers to it: \`lapwing calibrate use ${kept.name} --rig ${flags.rig}\``;
  process.stdout.write(`${how}\n`);
}

function list(flags: { rig: string; json?: boolean }): void {
  const rig = readRig(flags.rig);
  const now = new Date();
  const { calibrations, bad } = listCalibrations(rig.calibrationsFolder);
  const inForce = new Set(rig.calibrations.map(({ calibration }) => calibration.name));
  if (flags.json) {
    const rows = calibrations.map((one) => ({
      ...one,
      ...{ inForce: inForce.has(one.name), ageDays: ageDays(one, now), old: isOld(one, now) },
    }));
    process.stdout.write(`${JSON.stringify({ calibrations: rows, bad }, null, 2)}\n`);
    return;
  }
  if (calibrations.length === 0) {
    process.stdout.write(`nothing in ${rig.calibrationsFolder} yet\n`);
  }
  for (const one of calibrations) {
    const marks = [
      `${Math.floor(ageDays(one, now))} days old`,
      ...(inForce.has(one.name) ? ['in force'] : []),
      ...(isOld(one, now) ? [`older than its ${one.warnAfterDays} days: measure again`] : []),
      ...(one.board.simulated ? ['of a simulated rig'] : []),
    ];
    process.stdout.write(`${one.name}  ${one.kind} of ${one.of}, ${marks.join(', ')}\n`);
  }
  for (const { file, why } of bad) process.stderr.write(`${file} is no calibration: ${why}\n`);
}

function use(name: string, flags: { rig: string }): void {
  const rig = readRig(flags.rig);
  const { calibrations } = listCalibrations(rig.calibrationsFolder);
  const found = calibrations.find((one) => one.name === name);
  if (found === undefined) {
    const known = calibrations.map((one) => one.name).join(', ') || 'none';
    throw new LapwingError('calibrationBad', `No calibration is \`${name}\`: there is ${known}.`);
  }
  useCalibration(flags.rig, found);
  process.stdout.write(
    `${flags.rig} refers to ${name} now; the file as it was is beside it as .bak\nA loop that runs reads it when it is started again, or from the Rig page.\n`,
  );
}
