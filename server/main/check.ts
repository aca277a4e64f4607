import { resolve } from 'node:path';
import { Command } from 'commander';
import type { Source } from '../rules/ast.js';
import { lineColumn } from '../rules/formatProblems.js';
import { formatProblems, type Problem } from '../rules/problems.js';
import { readRules } from '../session/prepare.js';
import { readRig } from '../session/rig/readRig.js';

/** `lapwing check RULES`: every mistake and everything suspicious, with its place. */
export function checkCommand(): Command {
  return new Command('check')
    .description('tell every mistake in a rules file, and what is legal and suspicious')
    .argument('<rules>', 'the rules file')
    .option('--rig <file>', 'check against this rig too')
    .option('--json', 'print the problems as JSON')
    .action((path: string, flags: { rig?: string; json?: boolean }) => {
      const rig = flags.rig === undefined ? undefined : readRig(flags.rig);
      const { file, problems, sources } = readRules(resolve(path), rig);
      const text = flags.json
        ? JSON.stringify(
            problems.map((problem) => plain(problem, sources)),
            null,
            2,
          )
        : inWords(problems, sources);
      process.stdout.write(`${text}\n`);
      if (file === undefined) process.exitCode = 1;
    });
}

function inWords(problems: readonly Problem[], sources: readonly Source[]): string {
  const errors = problems.filter(({ severity }) => severity === 'error').length;
  const warnings = problems.length - errors;
  const verdict = `${count(errors, 'error')}, ${count(warnings, 'warning')}`;
  if (problems.length === 0) return verdict;
  const color = process.stdout.isTTY === true;
  return `${formatProblems(problems, sources, { color })}\n\n${verdict}`;
}

function count(number: number, what: string): string {
  return `${number === 0 ? 'no' : number} ${what}${number === 1 ? '' : 's'}`;
}

function plain(problem: Problem, sources: readonly Source[]): object {
  const { at, also = [], ...rest } = problem;
  const place = ({ file, start, end }: Problem['at']) => {
    const { path, text } = sources[file]!;
    return { path, from: lineColumn(text, start), to: lineColumn(text, end) };
  };
  return { ...rest, at: place(at), also: also.map(({ at, note }) => ({ at: place(at), note })) };
}
