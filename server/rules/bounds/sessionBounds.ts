import type { Moment, PhaseDecl, RuleDecl, RulesFile, When } from '../ast.js';
import { keyOf } from '../checks/contradiction.js';
import { alternativesOf, jumps, mostInSession, mostLaps, mostTimeUs } from '../checks/course.js';
import { intervalOf } from '../checks/interval.js';
import { resolve, type Symbols } from '../checks/symbols.js';
import type { RigFacts } from '../facts.js';
import { costOf } from './cost.js';

/** The most that a session can do, from the file and the rig alone; Infinity: nothing bounds it. */
export interface SessionBounds {
  readonly timeUs: number;
  /** Laps that may begin, the first one included. */
  readonly laps: number;
  readonly rules: readonly RuleBounds[];
  readonly outputs: readonly OutputBounds[];
  readonly waterNl: number;
}
export interface RuleBounds {
  readonly rule: string;
  readonly firings: number;
  /** What keeps it to that, in words; empty when nothing does. */
  readonly because: string;
  readonly outputs: readonly OutputBounds[];
  readonly waterNl: number;
}
export interface OutputBounds {
  readonly output: string;
  readonly pulses: number;
  readonly onUs: number;
}

/**
 * Bounds every rule and the whole session by the limits, the moments, the draws' bounds, the phases,
 * `end` and the rig's own limits. Never less than what can happen.
 * @param cells how often the operator starts the phases anew, the first time included
 */
export function bounds(file: RulesFile, rig?: RigFacts, cells = 1): SessionBounds {
  return new Bounder(resolve(file, rig), cells).session();
}

interface Most {
  readonly count: number;
  readonly because: string;
}

class Bounder {
  private readonly file: RulesFile;
  private readonly timeUs: number;
  private readonly laps: number;
  private readonly known = new Map<string, Most>();

  constructor(
    private readonly symbols: Symbols,
    private readonly cells: number,
  ) {
    this.file = symbols.file;
    const { time, laps } = courseBounds(symbols, cells);
    this.timeUs = time;
    this.laps = laps;
  }

  session(): SessionBounds {
    const rules = this.file.rules.map((rule) => this.rule(rule));
    return {
      timeUs: this.timeUs,
      laps: this.laps,
      rules,
      outputs: this.outputs(rules),
      waterNl: this.water(rules),
    };
  }

  private rule(rule: RuleDecl): RuleBounds {
    const { count: firings, because } = this.firings(rule, 0);
    const costs = rule.do.flatMap((action) => costOf(action, this.symbols) ?? []);
    const outputs = costs.map(({ name, pulses, onUs }) => ({
      output: name,
      pulses: times(pulses, firings),
      onUs: times(onUs, firings),
    }));
    const waterNl = costs.reduce((sum, cost) => sum + times(cost.volumeNl, firings), 0);
    return { rule: rule.name.name, firings, because, outputs: merged(outputs), waterNl };
  }

  /** The least of all that bounds it. */
  private firings(rule: RuleDecl, depth: number): Most {
    const name = rule.name.name;
    const known = this.known.get(name);
    if (known) return known;
    const all = [
      // Asked for at once, it needs no moment of its own.
      ...(rule.asked?.now ? [] : [this.byMoment(rule.when, depth)]),
      ...rule.limits.map((cap): Most => ({ count: this.byCap(cap), because: 'its limits' })),
      this.byWater(rule),
      this.byEnd(name),
      ...(rule.chance?.value === 0 && !rule.asked ? [{ count: 0, because: 'its chance' }] : []),
    ];
    const none: Most = { count: Infinity, because: '' };
    const least = all.reduce((a, b) => (b.count < a.count ? b : a), none);
    const most = Number.isFinite(least.count) ? least : none;
    if (depth === 0) this.known.set(name, most);
    return most;
  }

  private byMoment(when: When, depth: number): Most {
    if (when.kind === 'every') {
      const { low } = intervalOf(when.interval, this.symbols);
      return {
        count: low > 0 ? Math.floor(this.timeUs / low) : Infinity,
        because: 'the time there is',
      };
    }
    if (when.kind === 'every row') {
      const table = this.symbols.get(when.table.name);
      if (table?.kind !== 'table') return { count: Infinity, because: '' };
      const { rows } = table.decl;
      return {
        count: rows.kind === 'times' ? rows.timeUs.length : rows.lap.length,
        because: 'the rows of its table',
      };
    }
    if (when.kind === 'becomes') return { count: Infinity, because: '' };
    return this.byMomentAlone(when.kind === 'after' ? when.moment : when, depth);
  }

  private byMomentAlone(moment: Moment, depth: number): Most {
    const perLap = { count: this.laps, because: 'the laps there are' };
    switch (moment.kind) {
      case 'reaches':
        return perLap;
      case 'begins':
        if (moment.what === 'lap') return perLap;
        if (moment.what === 'session') return { count: 1, because: 'its moment, which comes once' };
        if (moment.what === 'cell') return { count: this.cells, because: 'the cells there are' };
        if (this.jumping()) return { count: Infinity, because: '' };
        return { count: this.cells, because: 'its phase, which comes once a cell' };
      case 'nth lick':
        if (moment.stretch === 'lap')
          return { count: this.laps + 1, because: 'the laps there are' };
        return moment.stretch === 'session'
          ? { count: 1, because: 'its moment, which comes once' }
          : { count: Infinity, because: '' };
      case 'fires': {
        const other = this.symbols.get(moment.rule.name);
        if (other?.kind !== 'rule' || depth > 100) return { count: Infinity, because: '' };
        return {
          count: this.firings(other.decl, depth + 1).count,
          because: `the firings of ${moment.rule.name}`,
        };
      }
      default:
        return { count: Infinity, because: '' };
    }
  }

  private byCap(cap: RuleDecl['limits'][number]): number {
    const high = (sum: Parameters<typeof intervalOf>[0]): number =>
      intervalOf(sum, this.symbols).high;
    const low = (sum: Parameters<typeof intervalOf>[0]): number =>
      intervalOf(sum, this.symbols).low;
    if (cap.kind === 'apart time') return Math.floor(this.timeUs / low(cap.time)) + 1;
    if (cap.kind === 'apart laps') return Math.floor(this.laps / low(cap.laps)) + 1;
    if (cap.per === 'session') return high(cap.count);
    // The part lap before the first counts too.
    if (cap.per === 'lap') return times(high(cap.count), this.laps + 1);
    if (cap.per === 'cell') return high(cap.count) * this.cells;
    if (cap.per === 'phase') {
      const phases = this.jumping() ? Infinity : Math.max(1, this.file.phases.length) * this.cells;
      return times(high(cap.count), phases);
    }
    return times(high(cap.count), Math.floor(this.timeUs / low(cap.per)) + 1);
  }

  private jumping(): boolean {
    const { named, next } = jumps(this.file);
    return next || named.size > 0;
  }

  /** `end` at a volume bounds every rule that gives some. */
  private byWater(rule: RuleDecl): Most {
    const most = this.endWater();
    const least = rule.do.reduce(
      (sum, { body, delay }) =>
        body.kind === 'give' && !delay ? sum + intervalOf(body.volume, this.symbols).low : sum,
      0,
    );
    // A sham gives no water, so that only real firings are bounded by it.
    if (!(least > 0) || rule.sham) return { count: Infinity, because: '' };
    return { count: Math.ceil(most / least) + 1, because: 'the water that ends the session' };
  }

  private byEnd(rule: string): Most {
    const key = keyOf({
      kind: 'firings',
      which: 'all',
      of: { name: rule },
      scope: { kind: 'this', stretch: 'session' },
    });
    const ends = [...mostInSession(this.file, this.symbols)].find(([name]) =>
      sameFirings(name, key),
    );
    return {
      count: ends ? Math.ceil(ends[1]) + 1 : Infinity,
      because: 'the firings that end the session',
    };
  }

  private endWater(): number {
    const key = keyOf({
      kind: 'scoped',
      measure: 'water given',
      scope: { kind: 'this', stretch: 'session' },
    });
    return mostInSession(this.file, this.symbols).get(key) ?? Infinity;
  }

  private outputs(rules: readonly RuleBounds[]): OutputBounds[] {
    const sums = merged(rules.flatMap((rule) => rule.outputs));
    return sums.map(({ output, pulses, onUs }) => {
      const facts = this.symbols.output(output);
      const most = Math.min(pulses, facts?.perSession ?? Infinity);
      const duty = facts?.duty;
      // Any window holds its share at most: so do all windows one after another.
      const byDuty = duty
        ? (Math.floor(this.timeUs / duty.windowUs) + 1) * duty.share * duty.windowUs
        : Infinity;
      const byPulses = times(most, this.widest(output));
      return { output, pulses: most, onUs: Math.min(onUs, byDuty, byPulses) };
    });
  }

  /** The longest that one pulse of an output may be on. */
  private widest(output: string): number {
    const costs = this.file.rules
      .flatMap((rule) => rule.do)
      .flatMap((action) => costOf(action, this.symbols) ?? [])
      .filter(({ name }) => name === output);
    return Math.max(
      0,
      ...costs.map(({ onUs, pulses }) => (Number.isFinite(pulses) ? onUs / pulses : Infinity)),
    );
  }

  /** What `end` allows and the drops already asked for when it comes true, or what the rules can. */
  private water(rules: readonly RuleBounds[]): number {
    const byRules = rules.reduce((sum, rule) => sum + rule.waterNl, 0);
    const together = this.file.rules
      .flatMap((rule) => rule.do)
      .reduce((sum, action) => sum + (costOf(action, this.symbols)?.volumeNl ?? 0), 0);
    return Math.min(byRules, this.endWater() + together);
  }
}

/** A key of a count of firings, whichever way its parts are ordered. */
function sameFirings(a: string, b: string): boolean {
  const sorted = (text: string): string =>
    JSON.stringify(Object.entries(JSON.parse(text) as object).sort(([x], [y]) => (x < y ? -1 : 1)));
  return sorted(a) === sorted(b);
}

function courseBounds(
  symbols: Symbols,
  cells: number,
): { readonly time: number; readonly laps: number } {
  const { file } = symbols;
  const most = mostInSession(file, symbols);
  let time = most.get(keyOf({ kind: 'measure', measure: 'time' })) ?? Infinity;
  let laps = Infinity;
  for (const term of file.end ? alternativesOf(file.end) : []) {
    if (term.kind !== 'compare' || (term.operator !== '>=' && term.operator !== '>')) continue;
    const { left, operator } = term;
    const bound = intervalOf(term.right, symbols).high;
    // With n laps done, lap n + 1 has begun.
    if (
      left.kind === 'scoped' &&
      left.measure === 'laps done' &&
      left.scope.kind === 'this' &&
      left.scope.stretch === 'session'
    ) {
      laps = Math.min(laps, Math.floor(bound) + (operator === '>' ? 2 : 1));
    }
    if (left.kind === 'measure' && left.measure === 'lap') {
      laps = Math.min(laps, Math.floor(bound) + (operator === '>' ? 1 : 0));
    }
  }
  const { named, next } = jumps(file);
  if (file.phases.length > 0 && named.size === 0 && !next) {
    const lapSum = file.phases.reduce((sum, phase) => sum + lapsOf(phase, symbols), 0);
    const timeSum = file.phases.reduce(
      (sum, phase) => sum + (phase.atLapEnd ? Infinity : mostTimeUs(phase, symbols)),
      0,
    );
    // The last lap's end begins one more.
    laps = Math.min(laps, lapSum * cells + 1);
    time = Math.min(time, timeSum * cells);
  }
  return { time, laps };
}

/** Laps that a phase may see: a part lap besides the whole ones where it or its start is in mid-lap. */
function lapsOf(phase: PhaseDecl, symbols: Symbols): number {
  const timed =
    phase.course.kind === 'for' && phase.course.lengths.some(({ kind }) => kind === 'time');
  return mostLaps(phase, symbols) + (timed || phase.atLapEnd ? 1 : 0);
}

/** Nothing times endless is nothing. */
function times(a: number, b: number): number {
  return a === 0 || b === 0 ? 0 : a * b;
}

function merged(outputs: readonly OutputBounds[]): OutputBounds[] {
  const sums = new Map<string, OutputBounds>();
  for (const { output, pulses, onUs } of outputs) {
    const before = sums.get(output);
    sums.set(output, {
      output,
      pulses: pulses + (before?.pulses ?? 0),
      onUs: onUs + (before?.onUs ?? 0),
    });
  }
  return [...sums.values()];
}
