import type { Condition, PhaseDecl, RuleDecl, RulesFile, Sum } from '../ast.js';
import { keyOf, termsOf } from './contradiction.js';
import { intervalOf } from './interval.js';
import type { Symbols } from './symbols.js';

/** The terms of which any one ends something. */
export function alternativesOf(condition: Condition): Condition[] {
  return condition.kind === 'or' ? condition.terms.flatMap(alternativesOf) : [condition];
}

/** Amounts that `end` keeps from growing: `time >= 60 min` ends the session, so time is 60 min at most. */
export function mostInSession(file: RulesFile, symbols: Symbols): Map<string, number> {
  const most = new Map<string, number>();
  for (const term of file.end ? alternativesOf(file.end) : []) {
    if (term.kind !== 'compare') continue;
    const grows = term.operator === '>=' || term.operator === '>';
    const [subject, bound] = grows ? [term.left, term.right] : [term.right, term.left];
    const { high } = intervalOf(bound, symbols);
    const key = keyOf(subject);
    if (Number.isFinite(high)) most.set(key, Math.min(high, most.get(key) ?? Infinity));
  }
  return most;
}

/** The phases in which a rule's `if` can hold, as far as it says so: `phase is A or B`. */
export function phasesOf(rule: RuleDecl, file: RulesFile): readonly PhaseDecl[] {
  let phases: readonly PhaseDecl[] = file.phases;
  const conditions = [rule.if, rule.when.kind === 'becomes' ? rule.when.condition : undefined];
  for (const term of conditions.flatMap((condition) => (condition ? termsOf(condition) : []))) {
    if (term.kind !== 'is' || term.subject.kind !== 'phase word') continue;
    const named = new Set(
      term.options.map((option) => (option.kind === 'name' ? option.name : '')),
    );
    phases = phases.filter(({ name }) => named.has(name.name) !== term.negated);
  }
  return phases;
}

/** The laps that a phase of fixed length lasts at most. */
export function mostLaps({ course }: PhaseDecl, symbols: Symbols): number {
  if (course.kind !== 'for') return Infinity;
  const laps = course.lengths.map((length) =>
    length.kind === 'laps' ? intervalOf(length.count, symbols).high : Infinity,
  );
  return Math.min(...laps);
}

export function mostTimeUs({ course }: PhaseDecl, symbols: Symbols): number {
  if (course.kind !== 'for') return Infinity;
  const times = course.lengths.map((length) =>
    length.kind === 'time' ? intervalOf(length.time, symbols).high : Infinity,
  );
  return Math.min(...times);
}

/** Names of the phases that a `go to` names, and whether one says `next phase`. */
export function jumps(file: RulesFile): {
  readonly named: ReadonlySet<string>;
  readonly next: boolean;
} {
  const named = new Set<string>();
  let next = false;
  for (const { body } of file.rules.flatMap((rule) => rule.do)) {
    if (body.kind !== 'go to') continue;
    if (body.phase === 'next phase') next = true;
    else named.add(body.phase.name);
  }
  return { named, next };
}

/** The phases that a session can come to, as the phases follow each other and rules jump. */
export function reachedPhases(
  file: RulesFile,
  hasWayOut: (phase: PhaseDecl) => boolean,
): ReadonlySet<string> {
  const { named, next } = jumps(file);
  const reached = new Set<string>();
  let open = true;
  for (const phase of file.phases) {
    if (open || named.has(phase.name.name)) {
      reached.add(phase.name.name);
      open = next || hasWayOut(phase);
    }
  }
  return reached;
}

/** Is there a rule that ends the session or leaves a phase by itself? */
export function endsByRule(file: RulesFile): boolean {
  return file.rules.some((rule) => rule.do.some(({ body }) => body.kind === 'end session'));
}

/** Firings of a rule that its own limits allow in a stretch; Infinity when none is said. */
export function mostFirings(rule: RuleDecl, stretch: string, symbols: Symbols): number {
  // A limit for a longer stretch holds in a shorter one too.
  const longer: Readonly<Record<string, readonly string[]>> = {
    lap: ['lap', 'phase', 'cell', 'session'],
    phase: ['phase', 'cell', 'session'],
    cell: ['cell', 'session'],
    session: ['session'],
  };
  const counts = rule.limits.map((cap) =>
    cap.kind === 'per' && typeof cap.per === 'string' && longer[stretch]?.includes(cap.per)
      ? intervalOf(cap.count, symbols).high
      : Infinity,
  );
  return Math.min(Infinity, ...counts);
}

/** `firings of R this S >= N` with a limit of R below N. */
export function firingsCannotReach(condition: Condition, symbols: Symbols): boolean {
  if (condition.kind !== 'compare') return false;
  const { operator, left, right } = condition;
  const grows = operator === '>=' || operator === '>';
  const [counted, bound]: [Sum, Sum] = grows ? [left, right] : [right, left];
  if (counted.kind !== 'firings' || counted.scope.kind !== 'this') return false;
  const rule = symbols.get(counted.of.name);
  if (rule?.kind !== 'rule') return false;
  const most = mostFirings(rule.decl, counted.scope.stretch, symbols);
  const { low } = intervalOf(bound, symbols);
  return operator === '>' || operator === '<' ? most <= low : most < low;
}
