import { userInfo } from 'node:os';
import { InvalidArgumentError, Option } from 'commander';

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
