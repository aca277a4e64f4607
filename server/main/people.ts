import { Command, Option } from 'commander';
import { readRig } from '../session/rig/readRig.js';
import { accessFiles, People, ROLES, type Role } from '../web/access/people.js';
import { rigOption } from './arguments.js';

interface PeopleFlags {
  rig: string;
  json?: boolean;
}

/** `lapwing people`: who may sign in at a rig's page over the network. */
export function peopleCommand(): Command {
  const command = new Command('people')
    .description("who may sign in at a rig's page over the network, and as what")
    .addCommand(listCommand(), { isDefault: true })
    .addCommand(addCommand())
    .addCommand(renewCommand())
    .addCommand(removeCommand());
  return command;
}

function listCommand(): Command {
  return new Command('list')
    .description('everybody, with role and the age of the secret')
    .addOption(rigOption())
    .option('--json', 'print JSON instead of words')
    .action((flags: PeopleFlags) => {
      const list = peopleOf(flags.rig).all.map(({ name, role, since }) => ({ name, role, since }));
      if (flags.json) {
        console.log(JSON.stringify({ people: list }, null, 2));
        return;
      }
      if (list.length === 0) console.log('Nobody yet: `lapwing people add NAME --rig RIG`.');
      for (const { name, role, since } of list) {
        console.log(`${name.padEnd(24)} ${role.padEnd(9)} secret of ${since.slice(0, 10)}`);
      }
    });
}

function addCommand(): Command {
  return new Command('add')
    .description('add somebody, and print a secret that is kept nowhere')
    .argument('<name>', 'letters, digits, `.`, `_` or `-`')
    .addOption(rigOption())
    .addOption(new Option('--as <role>', 'what they may do').choices(ROLES).default('viewer'))
    .option('--json', 'print JSON instead of words')
    .action(async (name: string, flags: PeopleFlags & { as: Role }) => {
      tellSecret(name, await peopleOf(flags.rig).add(name, flags.as), flags);
    });
}

function renewCommand(): Command {
  return new Command('renew')
    .description('give somebody a new secret; the old one ends, and so does what it signed in')
    .argument('<name>')
    .addOption(rigOption())
    .option('--json', 'print JSON instead of words')
    .action(async (name: string, flags: PeopleFlags) => {
      tellSecret(name, await peopleOf(flags.rig).renew(name), flags);
    });
}

function removeCommand(): Command {
  return new Command('remove')
    .description('take somebody out; they are signed out within seconds')
    .argument('<name>')
    .addOption(rigOption())
    .action((name: string, flags: PeopleFlags) => {
      peopleOf(flags.rig).remove(name);
      console.log(`${name} is gone.`);
    });
}

function peopleOf(rigPath: string): People {
  return new People(accessFiles(readRig(rigPath).name).peopleFile);
}

function tellSecret(name: string, secret: string, { rig, json }: PeopleFlags): void {
  const words = `${secretLines([{ name, secret }])}\n${secretsNote(rig)}`;
  console.log(json ? JSON.stringify({ name, secret }, null, 2) : words);
}

/** Names and secrets, to be read off a screen once. */
export function secretLines(made: readonly { name: string; secret: string }[]): string {
  const width = Math.max(...made.map(({ name }) => name.length));
  return made.map(({ name, secret }) => `  ${name.padEnd(width)}  ${secret}`).join('\n');
}

export function secretsNote(rigPath: string): string {
  return (
    'Write the secrets down now: they are shown once and kept nowhere. A lost one is replaced with\n' +
    `\`lapwing people renew NAME --rig ${rigPath}\`.`
  );
}
