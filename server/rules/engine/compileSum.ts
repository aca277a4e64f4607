import type { FieldPrediction } from '../../plasticity/fieldPrediction.js';
import type { NameRef, Option, PredictedAmount, Scope, SpanExpr, Spot, Sum } from '../ast.js';
import { boundsOf } from './bounds.js';
import { type Builder, keyOf, readsMeasure } from './builder.js';
import { markOf, placeMarkSince } from './compileMark.js';
import { inPhase } from './names.js';
import type { Amount } from './program.js';
import type { State } from './state.js';
import type { Tally } from './tally.js';

/** Longest look-back kept when the file does not bound it: a lap count, a time in microseconds. */
const MOST_LAPS = 1_000;
const MOST_WINDOW_US = 3_600_000_000;

/** Amounts known when compiling, so that arithmetic on them is done once. */
const constants = new WeakMap<Amount, number>();

export function constant(value: number): Amount {
  const amount: Amount = () => value;
  constants.set(amount, value);
  return amount;
}
export function constantOf(amount: Amount): number | undefined {
  return constants.get(amount);
}

/** An amount as a closure over the state: NaN when unknown, Infinity for never. */
export function compileSum(b: Builder, sum: Sum): Amount {
  switch (sum.kind) {
    case 'quantity':
      return constant(sum.value);
    case 'name':
      return compileName(b, sum.name);
    case 'edge':
      return edgesOfName(b, sum.of.name)[sum.edge === 'start' ? 'from' : 'to'];
    case 'negate': {
      const of = compileSum(b, sum.of);
      const known = constantOf(of);
      return known === undefined ? (s) => -of(s) : constant(-known);
    }
    case 'binary':
      return compileBinary(
        sum.operator,
        compileSum(b, sum.left),
        compileSum(b, sum.right),
        b.names.factorOf(sum),
      );
    case 'measure':
      return compileMeasure(sum.measure);
    case 'scoped':
      return compileScoped(b, sum);
    case 'firings':
      return compileFirings(b, sum);
    case 'predicted':
      return compilePredicted(b, sum);
    case 'since': {
      if (sum.mark.kind === 'name mark' && sum.mark.event === 'fires') {
        const rule = b.names.need(sum.mark.name.name, 'rule').index;
        if (sum.unit === 'time') return (s) => s.nowUs - s.rules[rule]!.lastUs;
        return (s) => s.lap - s.rules[rule]!.lastLap;
      }
      return placeMarkSince(markOf(b, sum.mark), sum.unit);
    }
  }
}

function compileBinary(
  operator: '+' | '-' | '*' | '/',
  left: Amount,
  right: Amount,
  factor: number,
): Amount {
  const make = (): Amount => {
    if (operator === '+') return (s) => left(s) + right(s);
    if (operator === '-') return (s) => left(s) - right(s);
    if (operator === '*') return (s) => left(s) * right(s) * factor;
    return (s) => {
      const divisor = right(s);
      return divisor === 0 ? Number.NaN : (left(s) / divisor) * factor;
    };
  };
  const amount = make();
  if (constantOf(left) === undefined || constantOf(right) === undefined) return amount;
  // Neither side reads the state.
  return constant(amount(undefined as unknown as State));
}

function compileName(b: Builder, name: string): Amount {
  const meaning = b.names.need(name, 'value', 'place', 'draw', 'choice');
  switch (meaning.kind) {
    case 'value': {
      const { value } = meaning.decl;
      return byPhase(b, (phase) => compileSum(b, inPhase(value, phase)), value.exceptions.length);
    }
    case 'place':
      return edgesOfName(b, name).from;
    case 'draw': {
      const { index } = meaning;
      return (s) => s.draws[index]!.amount(s);
    }
    case 'choice': {
      const { index } = meaning;
      const { choices } = meaning.decl;
      if (choices.kind === 'between') return (s) => s.choices[index]!.value;
      const options = choices.options.map((option) => compileOption(b, option));
      return (s) => options[s.choices[index]!.option]!(s);
    }
  }
}

/** One closure per phase when there are exceptions, the base alone when there are none. */
function byPhase(
  b: Builder,
  make: (phase: string | undefined) => Amount,
  exceptions: number,
): Amount {
  if (exceptions === 0) return make(undefined);
  const perPhase = b.file.phases.map((phase) => make(phase.name.name));
  return (s) => perPhase[s.phase]!(s);
}

/** What an option is worth: an amount, the place it names, or NaN for a mere word. */
export function compileOption(b: Builder, option: Option): Amount {
  if (option.kind === 'quantity') return constant(option.value);
  const meaning = b.names.get(option.name);
  if (meaning?.kind === 'place' || meaning?.kind === 'value') return compileName(b, option.name);
  return constant(Number.NaN);
}

interface Edges {
  readonly from: Amount;
  readonly to: Amount;
}

/** The edges of what a name stands for: a place, or a draw or choice among places. */
export function edgesOfName(b: Builder, name: string): Edges {
  const meaning = b.names.need(name, 'place', 'draw', 'choice');
  if (meaning.kind === 'place') {
    const { place } = meaning.decl;
    const edge = (pick: (spot: Spot) => Sum): Amount =>
      byPhase(b, (phase) => compileSum(b, pick(inPhase(place, phase))), place.exceptions.length);
    return { from: edge((spot) => spot.from), to: edge((spot) => spot.to ?? spot.from) };
  }
  const { index } = meaning;
  const { choices } = meaning.decl;
  if (choices.kind === 'between') {
    const amount = compileName(b, name);
    return { from: amount, to: amount };
  }
  const edges = choices.options.map((option) =>
    option.kind === 'name' && b.names.get(option.name)?.kind === 'place'
      ? edgesOfName(b, option.name)
      : { from: compileOption(b, option), to: compileOption(b, option) },
  );
  const chosen = (s: State): Edges | undefined =>
    edges[meaning.kind === 'draw' ? s.draws[index]!.option : s.choices[index]!.option];
  return {
    from: (s) => chosen(s)?.from(s) ?? Number.NaN,
    to: (s) => chosen(s)?.to(s) ?? Number.NaN,
  };
}

/** The index of a span, the same for every mention of it. */
export function spanOf(b: Builder, span: SpanExpr | NameRef): number {
  if (!('kind' in span) || span.kind === 'name') {
    return b.span(span.name, () => ({ ...edgesOfName(b, span.name), moving: false }));
  }
  return b.span(keyOf(span), () => ({
    from: compileSum(b, span.from),
    to: compileSum(b, span.to),
    moving: readsMeasure(span.from) || readsMeasure(span.to),
  }));
}

/** The index of a point that is reached. */
export function pointOf(b: Builder, place: Sum): number {
  const key = place.kind === 'name' ? place.name : keyOf(place);
  return b.point(key, () => ({ place: compileSum(b, place), moving: readsMeasure(place) }));
}

function compileMeasure(
  measure: 'position' | 'speed' | 'lap' | 'phase lap' | 'time' | 'phase time' | 'lap time',
): Amount {
  switch (measure) {
    case 'position':
      return (s) => (s.placed ? s.instant.positionCm : Number.NaN);
    case 'speed':
      return (s) => s.instant.speedCmPerS;
    case 'lap':
      return (s) => s.lap;
    case 'phase lap':
      return (s) => s.phaseLap();
    case 'time':
      return (s) => s.nowUs - s.startUs;
    case 'phase time':
      return (s) => s.nowUs - s.phaseUs;
    case 'lap time':
      return (s) => s.nowUs - s.lapUs;
  }
}

/** How a tally is read over a scope, and what it must remember for that. */
interface ScopeReader {
  readonly need: { visitOf?: number; laps?: number; windowUs?: number };
  readonly read: (s: State, tally: Tally) => number;
}

function scopeReader(b: Builder, scope: Scope, span: number): ScopeReader {
  if (scope.kind === 'this') {
    switch (scope.stretch) {
      case 'visit':
        return {
          need: { visitOf: span },
          read: (s, tally) => (s.spans[span]!.visiting ? tally.thisVisit() : Number.NaN),
        };
      case 'lap':
        return { need: {}, read: (_s, tally) => tally.thisLap() };
      case 'phase':
        return { need: {}, read: (_s, tally) => tally.thisPhase() };
      case 'cell':
        return { need: {}, read: (_s, tally) => tally.thisCell() };
      case 'session':
        return { need: {}, read: (_s, tally) => tally.total };
    }
  }
  if (scope.kind === 'last laps') {
    const count = compileSum(b, scope.count);
    const laps = bounded(boundsOf(scope.count, b.names).most, MOST_LAPS);
    return {
      need: { laps },
      read: (s, tally) => {
        const n = Math.floor(count(s));
        // More than have gone by in this phase (or than are kept) is unknown.
        if (!(n >= 1) || n > laps || s.phaseLap() - 1 < n) return Number.NaN;
        return tally.overLaps(n, s.lapOrdinal);
      },
    };
  }
  const time = compileSum(b, scope.time);
  const windowUs = bounded(boundsOf(scope.time, b.names).most, MOST_WINDOW_US);
  return {
    need: { windowUs },
    read: (s, tally) => {
      const back = time(s);
      if (!(back > 0) || back > windowUs || s.nowUs - s.phaseUs < back) return Number.NaN;
      return tally.since(s.nowUs - back);
    },
  };
}

function bounded(most: number, otherwise: number): number {
  return most < Number.POSITIVE_INFINITY ? Math.max(1, Math.ceil(most)) : otherwise;
}

function compileScoped(b: Builder, sum: Extract<Sum, { kind: 'scoped' }>): Amount {
  const span = sum.within ? spanOf(b, sum.within) : -1;
  if (sum.measure === 'laps done') return lapsDone(b, sum.scope);
  const { need, read } = scopeReader(b, sum.scope, span);
  switch (sum.measure) {
    case 'licks': {
      const tally = b.tally('licks', span, need);
      return (s) => read(s, s.tallies[tally]!);
    }
    case 'water given': {
      const tally = b.tally('water', -1, need);
      return (s) => read(s, s.tallies[tally]!);
    }
    case 'share of licks': {
      const within = b.tally('licks', span, need);
      const all = b.tally('licks', -1, need);
      return (s) => {
        const licks = read(s, s.tallies[all]!);
        return licks === 0 ? Number.NaN : read(s, s.tallies[within]!) / licks;
      };
    }
    case 'mean speed': {
      const distance = b.tally('distance', span, need);
      const duration = b.tally('duration', span, need);
      return (s) => {
        const us = read(s, s.tallies[duration]!);
        if (!(us > 0)) return Number.NaN;
        return ((read(s, s.tallies[distance]!) / s.countsPerCm) * 1_000_000) / us;
      };
    }
  }
}

function lapsDone(b: Builder, scope: Scope): Amount {
  if (scope.kind === 'this') {
    switch (scope.stretch) {
      case 'phase':
        return (s) => atLeastZero(s.phaseLap() - 1);
      case 'cell':
        return (s) => atLeastZero(s.lapOrdinal - s.cellLapBase - 1);
      case 'session':
        return (s) => atLeastZero(s.lap - 1);
      default:
        return constant(0);
    }
  }
  if (scope.kind === 'last laps') {
    const count = compileSum(b, scope.count);
    return (s) => {
      const n = count(s);
      return s.phaseLap() - 1 >= n ? n : Number.NaN;
    };
  }
  const reader = scopeReader(b, scope, -1);
  const tally = b.tally('laps', -1, reader.need);
  return (s) => reader.read(s, s.tallies[tally]!);
}

function atLeastZero(value: number): number {
  return Math.max(0, value);
}

function compileFirings(b: Builder, sum: Extract<Sum, { kind: 'firings' }>): Amount {
  const rule = b.names.need(sum.of.name, 'rule').index;
  const { need, read } = scopeReader(b, sum.scope, -1);
  const real = b.tally('real firings', rule, need);
  const sham = b.tally('sham firings', rule, need);
  if (sum.which === 'real') return (s) => read(s, s.tallies[real]!);
  if (sum.which === 'sham') return (s) => read(s, s.tallies[sham]!);
  return (s) => read(s, s.tallies[real]!) + read(s, s.tallies[sham]!);
}

/** Of the last firing in this cell; unknown before the second after it has gone by. */
function compilePredicted(b: Builder, sum: Extract<Sum, { kind: 'predicted' }>): Amount {
  const rule = b.names.need(sum.of.name, 'rule').index;
  const read = READ_FIELD[sum.what];
  return (s) => {
    const { field, fieldCell } = s.rules[rule]!;
    return field === undefined || fieldCell !== s.cellOrdinal ? Number.NaN : read(field);
  };
}

const READ_FIELD: Readonly<Record<PredictedAmount, (field: FieldPrediction) => number>> = {
  width: (field) => field.widthCm,
  centre: (field) => field.centreCm,
  shift: (field) => field.shiftCm,
  asymmetry: (field) => field.asymmetry,
};
