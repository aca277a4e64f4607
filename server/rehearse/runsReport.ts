import { quantile } from '../analysis/align/robustLine.js';
import type { RulesFile } from '../rules/ast.js';
import { alternativesOf } from '../rules/ast.js';
import { printCondition } from '../rules/printSum.js';
import { ruleWords } from './inquest.js';
import { lickShare } from './lapLicks.js';
import type { RunResult, RunRule } from './runResult.js';

/** A quantity over the runs. */
export interface Spread {
  readonly least: number;
  /** 5 %, 50 % and 95 % of the runs lie at or below. */
  readonly low: number;
  readonly median: number;
  readonly high: number;
  readonly most: number;
  /** Runs in each of equal bins from `least` to `most`. */
  readonly bins: readonly number[];
}

/** Why moments of a rule came to nothing. */
export interface Hindrance {
  /** A term of its `if`, its chance, one of its limits, or what the guard or the board said. */
  readonly kind: 'if' | 'chance' | 'limit' | 'guard';
  readonly words: string;
  readonly times: number;
  /** Of them, times at which it could not be known (a place, before position is). */
  readonly unknown: number;
  /** Runs in which it happened at least once. */
  readonly runs: number;
}

export interface RuleReport {
  readonly name: string;
  readonly when: string;
  readonly fired: Spread;
  readonly shams: Spread;
  readonly byPhase: readonly { readonly phase: string; readonly fired: Spread }[];
  /** Runs in which it fired at all, shams included. */
  readonly runsFired: number;
  /** Moments at which it was asked, in all runs. */
  readonly moments: number;
  /** Most frequent first. */
  readonly why: readonly Hindrance[];
  /** True distance from the place intended, slip included, mm; null where none fired at a place so. */
  readonly boardMm: Spread | null;
  readonly hostMm: Spread | null;
}

export interface PhaseReport {
  readonly name: string;
  readonly runsEntered: number;
  /** Runs that ended in it. */
  readonly runsNotLeft: number;
  /** Over the runs that entered it. */
  readonly minutes: Spread | null;
}

export interface DrawReport {
  readonly name: string;
  /** Each value that was drawn, or `lowest to highest` of many numbers in fifths. */
  readonly values: readonly {
    readonly value: string;
    readonly times: number;
    readonly share: number;
    /** Its share within each run. */
    readonly perRun: Spread;
  }[];
}

/** How sessions of a rules file go, over many runs with another animal and other draws each. */
export interface RunsReport {
  readonly title: string;
  readonly runs: number;
  readonly seed: string;
  readonly animal: string;
  readonly latency: string;
  readonly minutes: Spread;
  readonly laps: Spread;
  readonly licks: Spread;
  readonly waterUl: Spread;
  /** Share of licks at the spout or in the approach; null where no run had such licks. */
  readonly lickShare: Spread | null;
  readonly ends: readonly { readonly reason: string; readonly runs: number }[];
  /** Each alternative of `end`: runs in which it was true at the end. */
  readonly endAlternatives: readonly { readonly words: string; readonly runs: number }[];
  readonly rules: readonly RuleReport[];
  readonly phases: readonly PhaseReport[];
  readonly draws: readonly DrawReport[];
  /** What to know when reading it. */
  readonly notes: readonly string[];
}

export interface RunsCircumstances {
  readonly seed: string;
  readonly animal: string;
  readonly latency: string;
  readonly notes: readonly string[];
}

const BINS = 24;
const MOST_WORDS = 12;
const PARTS = 5;

/** The report of some runs, whatever their order. @param results at least one */
export function runsReport(
  file: RulesFile,
  results: readonly RunResult[],
  circumstances: RunsCircumstances,
): RunsReport {
  const runs = [...results].sort((a, b) => a.run - b.run);
  const of = (value: (run: RunResult) => number) => spread(runs.map(value));
  const shares = runs.map(({ lapLicks }) => lickShare(lapLicks)).filter(Number.isFinite);
  const words = ruleWords(file);
  const phaseNames = file.phases.map(({ name }) => name.name);
  return {
    title: file.title,
    runs: runs.length,
    ...circumstances,
    minutes: of(({ sessionS }) => sessionS / 60),
    laps: of(({ laps }) => laps),
    licks: of(({ licks }) => licks),
    waterUl: of(({ waterUl }) => waterUl),
    lickShare: shares.length === 0 ? null : spread(shares),
    ends: counted(runs.map(({ endedBecause }) => endedBecause)),
    endAlternatives: alternativesOf(file.end).map((one, n) => ({
      words: printCondition(one),
      runs: runs.filter(({ ends }) => ends[n] === 1).length,
    })),
    rules: words.map((rule, n) =>
      ruleReport(
        rule,
        runs.map(({ rules }) => rules[n]!),
        phaseNames,
      ),
    ),
    phases: phaseNames.map((name, n) => phaseReport(name, runs, n)),
    draws: file.draws.map((_, n) => drawReport(runs, n)),
  };
}

function ruleReport(
  words: ReturnType<typeof ruleWords>[number],
  runs: readonly RunRule[],
  phaseNames: readonly string[],
): RuleReport {
  const why = hindrances(words, runs);
  const tried = (run: RunRule) =>
    run.fired +
    run.shams +
    run.notTrue +
    run.chance +
    sum(run.limits) +
    sum(run.not.map(([, n]) => n));
  const all = (of: (run: RunRule) => readonly number[]) => {
    const values = runs.flatMap(of);
    return values.length === 0 ? null : spread(values);
  };
  return {
    ...{ name: words.name, when: words.when },
    fired: spread(runs.map(({ fired }) => fired)),
    shams: spread(runs.map(({ shams }) => shams)),
    byPhase: phaseNames.map((phase, n) => ({
      phase,
      fired: spread(runs.map(({ byPhase }) => byPhase[n]!)),
    })),
    runsFired: runs.filter(({ fired, shams }) => fired + shams > 0).length,
    moments: sum(runs.map(tried)),
    why,
    boardMm: all(({ boardMm }) => boardMm),
    hostMm: all(({ hostMm }) => hostMm),
  };
}

function hindrances(
  words: ReturnType<typeof ruleWords>[number],
  runs: readonly RunRule[],
): Hindrance[] {
  const found: Hindrance[] = [];
  const add = (
    kind: Hindrance['kind'],
    text: string,
    times: (run: RunRule) => number,
    unknown: (run: RunRule) => number = () => 0,
  ) => {
    const counts = runs.map((run) => times(run) + unknown(run));
    if (sum(counts) === 0) return;
    found.push({
      ...{ kind, words: text, times: sum(counts), unknown: sum(runs.map(unknown)) },
      runs: counts.filter((count) => count > 0).length,
    });
  };
  words.terms.forEach((term, n) => {
    add(
      'if',
      term,
      (run) => run.untrue[n]!,
      (run) => run.unknown[n]!,
    );
  });
  add('chance', 'its chance did not come up', (run) => run.chance);
  words.limits.forEach((limit, n) => {
    add('limit', limit, (run) => run.limits[n]!);
  });
  const reasons = new Set(runs.flatMap(({ not }) => not.map(([reason]) => reason)));
  for (const reason of reasons) {
    add('guard', reason, ({ not }) => not.find(([other]) => other === reason)?.[1] ?? 0);
  }
  return found.sort((a, b) => b.times - a.times);
}

function phaseReport(name: string, runs: readonly RunResult[], n: number): PhaseReport {
  const entered = runs.map(({ phases }) => phases[n]!).filter((phase) => phase.entered > 0);
  return {
    name,
    runsEntered: entered.length,
    runsNotLeft: entered.filter((phase) => phase.left < phase.entered).length,
    minutes: entered.length === 0 ? null : spread(entered.map(({ seconds }) => seconds / 60)),
  };
}

/** Words and few numbers are counted as they are; many numbers in parts of their range. */
function drawReport(runs: readonly RunResult[], n: number): DrawReport {
  const draws = runs.map(({ draws: all }) => all[n]!);
  const distinct = [...new Set(draws.flatMap(({ values }) => values.map(([value]) => value)))];
  // Hundreds of thousands: too many to be the arguments of one call.
  const numbers = distinct.filter((value) => typeof value === 'number').sort((a, b) => a - b);
  const inParts = distinct.length > MOST_WORDS && numbers.length > 0;
  const least = numbers[0] ?? 0;
  const width = ((numbers.at(-1) ?? 0) - least) / PARTS;
  const nameOf = (value: number | string): string => {
    if (!inParts || typeof value !== 'number') return String(value);
    const part = Math.min(PARTS - 1, Math.floor((value - least) / width));
    const edge = (k: number) => String(Number((least + k * width).toPrecision(3)));
    return `${edge(part)} to ${edge(part + 1)}`;
  };
  const names = inParts
    ? numbers.map(nameOf)
    : distinct.map(nameOf).sort((a, b) => a.localeCompare(b, 'en', { numeric: true }));
  const timesIn = (draw: (typeof draws)[number], name: string) =>
    sum(draw.values.filter(([value]) => nameOf(value) === name).map(([, times]) => times));
  const all = sum(draws.flatMap(({ values }) => values.map(([, times]) => times)));
  return {
    name: draws[0]!.name,
    values: [...new Set(names)].map((value) => {
      const times = sum(draws.map((draw) => timesIn(draw, value)));
      const perRun = draws.map((draw) => {
        const drawn = sum(draw.values.map(([, count]) => count));
        return drawn === 0 ? Number.NaN : timesIn(draw, value) / drawn;
      });
      return { value, times, share: times / all, perRun: spread(perRun.filter(Number.isFinite)) };
    }),
  };
}

/** @param values at least one */
export function spread(values: readonly number[]): Spread {
  const sorted = [...values].sort((a, b) => a - b);
  const least = sorted[0]!;
  const most = sorted.at(-1)!;
  const bins: number[] = new Array(BINS).fill(0);
  const width = (most - least) / BINS;
  for (const value of sorted) {
    bins[width === 0 ? 0 : Math.min(BINS - 1, Math.floor((value - least) / width))]!++;
  }
  return {
    ...{ least, low: quantile(sorted, 0.05), median: quantile(sorted, 0.5) },
    ...{ high: quantile(sorted, 0.95), most, bins },
  };
}

function counted(reasons: readonly string[]): { reason: string; runs: number }[] {
  const counts = new Map<string, number>();
  for (const reason of reasons) counts.set(reason, (counts.get(reason) ?? 0) + 1);
  return [...counts]
    .map(([reason, runs]) => ({ reason, runs }))
    .sort((a, b) => b.runs - a.runs || (a.reason < b.reason ? -1 : 1));
}

function sum(values: readonly number[]): number {
  return values.reduce((total, value) => total + value, 0);
}
