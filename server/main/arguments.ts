import { userInfo } from 'node:os';
import { InvalidArgumentError, Option } from 'commander';
import { DEFAULT_PORT } from '../web/port.js';
import { rigFile } from './builtInRigs.js';

/** `--rig RIG`, which every command that needs a rig takes. */
export function rigOption(): Option {
  return new Option('--rig <file>', 'the rig file; or one that comes along: simulated, emulated')
    .argParser(rigFile)
    .makeOptionMandatory();
}

/** A whole number from `least` to `most`. */
export function wholeNumber(least: number, most: number): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (Number.isInteger(value) && value >= least && value <= most) return value;
    throw new InvalidArgumentError(`expected a whole number from ${least} to ${most}`);
  };
}

/** `--answer name=value ...`: answers to a guide's questions, in advance. */
export function answersOption(example: string): Option {
  return new Option('--answer <name=value...>', `answer a question in advance: ${example}`)
    .argParser((text: string, before: Record<string, string>) => {
      const at = text.indexOf('=');
      if (at < 1) throw new InvalidArgumentError('expected NAME=VALUE');
      return { ...before, [text.slice(0, at)]: text.slice(at + 1) };
    })
    .default({}, 'none');
}

/** The name of whoever is logged in, where the system knows it. */
export function loginName(): string {
  try {
    return userInfo().username;
  } catch {
    return '';
  }
}

/** `--port NUMBER`: where the page is served on this machine. */
export function portOption(): Option {
  return new Option('--port <number>', 'where the page is served, on this machine only')
    .argParser(wholeNumber(0, 65_535))
    .default(DEFAULT_PORT);
}
