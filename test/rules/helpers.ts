import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { packageRoot } from '../../server/packageRoot.js';
import type { RulesFile } from '../../server/rules/ast.js';
import type { RigFacts } from '../../server/rules/facts.js';
import { formatProblems } from '../../server/rules/problems.js';
import { type Checked, checkText } from '../../server/rules/readRules.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { factsOf } from '../../server/session/rig/rig.js';

export const SESSIONS = join(packageRoot, 'hardware-sim/demo/sessions');
export const readFile = (path: string): Uint8Array => readFileSync(path);

const demo = factsOf(readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml')));
const laser = demo.outputs.find(({ name }) => name === 'laser')!;

/** The demo's rig with a lamp that may be on for long, and one of each kind besides. */
export const RIG: RigFacts = {
  ...demo,
  outputs: [
    ...demo.outputs,
    { name: 'lamp', index: 9, kind: 'stimulus', longestOnUs: 10_000_000, leastGapUs: 0 },
    { ...laser, name: 'bare', index: 10 },
  ],
};

/** What a phrase may name: the page says so. */
const BESIDE = {
  draws: ['kind: stim or sham, every lap'],
  places: ['zone: 85 to 95 cm', 'target: 45 cm'],
  phases: ['probe: to the end'],
};

/** A whole file around one phrase of the page. */
export function around(key: string, phrase: string): string {
  const rule: Record<string, string> = { when: 'reaches target', do: 'give 4 uL' };
  const sections: Record<string, string[]> = { values: [], operator: [], ...BESIDE };
  const section = {
    value: 'values',
    place: 'places',
    draw: 'draws',
    phase: 'phases',
    operator: 'operator',
  }[key];
  if (section === 'phases') sections.phases = [`first: ${phrase}`, 'probe: to the end'];
  else if (section) sections[section] = [...sections[section]!, `mine: ${phrase}`];
  else rule[key] = phrase;
  // A time or a distance is said of a moment that has one.
  const lines = Object.entries(sections)
    .filter(([, entries]) => entries.length > 0)
    .map(([name, entries]) => `${name}:\n${entries.map((entry) => `  ${entry}\n`).join('')}`);
  const keys = Object.entries(rule).map(([name, text]) => `    ${name}: ${text}\n`);
  const water = key === 'when' || key === 'do' ? 'other' : 'water';
  const extra = water === 'other' ? '  water:\n    when: lap begins\n    do: give 4 uL\n' : '';
  return `title: t\nbelt: 180 cm\n${lines.join('')}rules:\n  ${water}:\n${keys.join('')}${extra}end: time >= 60 min\n`;
}

export function check(text: string, rig: RigFacts | null = RIG): Checked {
  return checkText('test.yaml', text, rig ?? undefined);
}

/** `code: underlined words` of each problem. */
export function found(text: string, rig: RigFacts | null = RIG): string[] {
  const { problems, sources } = check(text, rig);
  return problems.map(
    ({ code, at }) => `${code}: ${sources[at.file]!.text.slice(at.start, at.end)}`,
  );
}

/** The file, or a failure that shows every problem. */
export function right(text: string, rig: RigFacts | null = RIG): RulesFile {
  const { file, problems, sources } = check(text, rig);
  if (!file) throw new Error(formatProblems(problems, sources));
  return file;
}

/** A tree without its places: what a printed file must give again. */
export function bare(file: unknown): unknown {
  return JSON.parse(
    JSON.stringify(file, (key, value) => (key === 'at' || key === 'sources' ? undefined : value)),
  );
}

/** A file of sections, each a list of its lines; `rules` in full. */
export function sections(parts: Readonly<Record<string, string>>): string {
  const {
    rules = 'r:\n  when: lap begins\n  do: note',
    end = 'time >= 60 min',
    title = 't',
    belt = '180 cm',
    ...rest
  } = parts;
  const indented = (text: string): string =>
    text
      .split('\n')
      .map((line) => `  ${line}\n`)
      .join('');
  const others = Object.entries(rest).map(([key, text]) => `${key}:\n${indented(text)}`);
  return `title: ${title}\nbelt: ${belt}\n${others.join('')}rules:\n${indented(rules)}${end === '' ? '' : `end: ${end}\n`}`;
}
