import { alternativesOf, type RulesFile, termsOf } from '../rules/ast.js';
import type { Inquiry } from '../rules/instant.js';
import { printCap, printWhen } from '../rules/printRule.js';
import { printCondition } from '../rules/printSum.js';

/** Why the moments of one rule came to nothing, by count. */
export interface Declines {
  /** Moments at which its `if` was not true; the counts by term may add up to more. */
  notTrue: number;
  readonly untrue: number[];
  readonly unknown: number[];
  chance: number;
  readonly limits: number[];
}

/** The words of what may have stood in a rule's way, in the order of the counts. */
export interface RuleWords {
  readonly name: string;
  readonly when: string;
  readonly terms: readonly string[];
  readonly limits: readonly string[];
}

/** Counts, in one session, what the engine tells of rules that it did not try. */
export class Inquest implements Inquiry {
  readonly declines: readonly Declines[];
  /** How often each alternative of `end` was true as the rules ended the session: 0 or 1. */
  readonly ends: number[];

  constructor(file: RulesFile) {
    this.declines = file.rules.map((rule) => {
      const none = () => termsOf(rule.if).map(() => 0);
      return {
        ...{ notTrue: 0, untrue: none(), unknown: none(), chance: 0 },
        limits: rule.limits.map(() => 0),
      };
    });
    this.ends = alternativesOf(file.end).map(() => 0);
  }

  ifFailed(rule: number, untrue: number, unknown: number): void {
    const declines = this.declines[rule]!;
    declines.notTrue++;
    for (let n = 0; n < declines.untrue.length; n++) {
      if (((untrue >>> n) & 1) === 1) declines.untrue[n]!++;
      if (((unknown >>> n) & 1) === 1) declines.unknown[n]!++;
    }
  }

  chanceFailed(rule: number): void {
    this.declines[rule]!.chance++;
  }

  limitMet(rule: number, limit: number): void {
    this.declines[rule]!.limits[limit]!++;
  }

  ended(alternatives: number): void {
    for (let n = 0; n < this.ends.length; n++) this.ends[n] = (alternatives >>> n) & 1;
  }
}

/** What the counts of an inquest stand for, rule by rule. */
export function ruleWords(file: RulesFile): RuleWords[] {
  return file.rules.map((rule) => ({
    name: rule.name.name,
    when: printWhen(rule.when),
    terms: termsOf(rule.if).map((term) => printCondition(term)),
    limits: rule.limits.map(printCap),
  }));
}
