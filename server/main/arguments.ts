import { userInfo } from 'node:os';
import { InvalidArgumentError, Option } from 'commander';
import { DEFAULT_PORT } from '../web/webProcess.js';

/** `--rig RIG`, which every command that needs a rig takes. */
export function rigOption(): Option {
  return new Option('--rig <file>', 'the rig file').makeOptionMandatory();
}

/** A whole number from `least` to `most`. */
export function wholeNumber(least: number, most: number): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (Number.isInteger(value) && value >= least && value <= most) return value;
    throw new InvalidArgumentError(`expected a whole number from ${least} to ${most}`);
  };
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
