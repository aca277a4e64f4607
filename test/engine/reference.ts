import type { Condition, Scope, SpanExpr, Sum } from '../../server/rules/ast.js';

/**
 * A slow and obvious reading of conditions, to hold the engine's closures against. It keeps every
 * frame of the session and looks all of them through at each question. It knows points and spans
 * that do not move, licks, water, firings, inputs, phases by number, and the measures of place and
 * time; it shares no code with the engine.
 */
export interface Moment {
  readonly timeUs: number;
  readonly lap: number;
  /** Counts since 0 cm; undefined before lap 1. */
  readonly counts: number | undefined;
  readonly moved: number;
  readonly speed: number;
  readonly lick: boolean;
  readonly inputs: number;
  /** Nanolitres given up to the rules' turn at this frame, since the frame before. */
  readonly water: number;
  /** Names of rules that fired before this question, at this frame or after the one before. */
  readonly fired: readonly string[];
  readonly lapBegan: boolean;
  readonly phaseBegan: boolean;
}

export interface World {
  readonly frames: readonly Moment[];
  readonly places: Readonly<Record<string, readonly [number, number]>>;
  readonly phase: string;
  readonly inputs: Readonly<Record<string, number>>;
}

/** undefined: unknown. */
export type Answer = boolean | undefined;
type Value = number | undefined;

export function answer(c: Condition, w: World): Answer {
  const now = w.frames.at(-1)!;
  switch (c.kind) {
    case 'and': {
      const all = c.terms.map((t) => answer(t, w));
      if (all.includes(false)) return false;
      return all.includes(undefined) ? undefined : true;
    }
    case 'or': {
      const all = c.terms.map((t) => answer(t, w));
      if (all.includes(true)) return true;
      return all.includes(undefined) ? undefined : false;
    }
    case 'not': {
      const of = answer(c.of, w);
      return of === undefined ? undefined : !of;
    }
    case 'in':
      return isIn(now, c.span, w);
    case 'still':
      return Math.abs(now.speed) < 1;
    case 'compare': {
      const a = amount(c.left, w);
      const b = amount(c.right, w);
      if (a === undefined || b === undefined) return undefined;
      if (c.operator === '<') return a < b;
      if (c.operator === '<=') return a <= b;
      return c.operator === '>' ? a > b : a >= b;
    }
    case 'is range': {
      const [x, a, b] = [amount(c.subject, w), amount(c.from, w), amount(c.to, w)];
      if (x === undefined || a === undefined || b === undefined) return undefined;
      return (a <= x && x <= b) !== c.negated;
    }
    case 'multiple': {
      const [x, n] = [amount(c.subject, w), amount(c.of, w)];
      if (x === undefined || n === undefined || n === 0) return undefined;
      return (Number.isFinite(x) && Math.abs(x % n) === 0) !== c.negated;
    }
    case 'is': {
      if (c.subject.kind === 'phase word') {
        return c.options.some((o) => o.kind === 'name' && o.name === w.phase) !== c.negated;
      }
      if (c.subject.kind === 'name') {
        const high = ((now.inputs >> w.inputs[c.subject.name]!) & 1) === 1;
        const wanted = c.options.some(
          (o) => o.kind === 'name' && o.name === (high ? 'high' : 'low'),
        );
        return wanted !== c.negated;
      }
      const x = amount(c.subject, w);
      if (x === undefined) return undefined;
      return c.options.some((o) => o.kind === 'quantity' && o.value === x) !== c.negated;
    }
  }
}

function edges(span: SpanExpr, w: World): [number, number] {
  const [from, to] =
    span.kind === 'name' ? w.places[span.name]! : [amount(span.from, w)!, amount(span.to, w)!];
  return [Math.round(from * 25), Math.round(to * 25)];
}

function isIn(m: Moment, span: SpanExpr, w: World): Answer {
  if (m.counts === undefined) return undefined;
  const [from, to] = edges(span, w);
  if (from <= to) return m.counts >= from && m.counts < to;
  return m.counts >= from || m.counts < to;
}

/**
 * The frames that a scope takes in, or undefined when it reaches further than what has gone by. At
 * the frame that begins a phase, movement, licks and water come before the phase, firings after it.
 */
function framesOf(scope: Scope, w: World, of: 'firings' | 'inputs'): readonly Moment[] | undefined {
  const { frames } = w;
  const last = (begins: (m: Moment) => boolean): number => {
    for (let n = frames.length - 1; n > 0; n--) if (begins(frames[n]!)) return n;
    return 0;
  };
  if (scope.kind === 'this') {
    if (scope.stretch === 'lap') return frames.slice(last((m) => m.lapBegan));
    if (scope.stretch === 'phase')
      return frames.slice(last((m) => m.phaseBegan) + (of === 'inputs' ? 1 : 0));
    return frames;
  }
  const phase = last((m) => m.phaseBegan);
  if (scope.kind === 'last time') {
    const back = amount(scope.time, w)!;
    const nowUs = frames.at(-1)!.timeUs;
    if (nowUs - frames[phase]!.timeUs < back) return undefined;
    return frames.filter((m) => m.timeUs > nowUs - back);
  }
  const count = amount(scope.count, w)!;
  const begins = frames.flatMap((m, n) => (m.lapBegan && n >= phase ? [n] : []));
  if (begins.length - 1 < count) return undefined;
  return frames.slice(begins.at(-1 - count), begins.at(-1));
}

function sum(frames: readonly Moment[], of: (m: Moment) => number): number {
  return frames.reduce((total, m) => total + of(m), 0);
}

export function amount(s: Sum, w: World): Value {
  const now = w.frames.at(-1)!;
  switch (s.kind) {
    case 'quantity':
      return s.value;
    case 'name':
      return w.places[s.name]![0];
    case 'edge':
      return w.places[s.of.name]![s.edge === 'start' ? 0 : 1];
    case 'negate': {
      const of = amount(s.of, w);
      return of === undefined ? undefined : -of;
    }
    case 'binary': {
      const [a, b] = [amount(s.left, w), amount(s.right, w)];
      if (a === undefined || b === undefined) return undefined;
      const result = { '+': a + b, '-': a - b, '*': a * b, '/': b === 0 ? Number.NaN : a / b };
      return Number.isNaN(result[s.operator]) ? undefined : result[s.operator];
    }
    case 'measure':
      return measured(s.measure, w);
    case 'firings': {
      const frames = framesOf(s.scope, w, 'firings');
      if (!frames) return undefined;
      return sum(frames, (m) => m.fired.filter((name) => name === s.of.name).length);
    }
    case 'since': {
      const { mark } = s;
      const happened = w.frames.findLast((m) =>
        mark.kind === 'name mark'
          ? m.fired.includes(mark.name.name)
          : mark.kind === 'lick mark' &&
            m.lick &&
            (!mark.within || isIn(m, { ...mark.within, kind: 'name' }, w) === true),
      );
      if (!happened) return Number.POSITIVE_INFINITY;
      return s.unit === 'time' ? now.timeUs - happened.timeUs : now.lap - happened.lap;
    }
    case 'scoped': {
      const frames = framesOf(s.scope, w, 'inputs');
      if (!frames) return undefined;
      const there = (m: Moment): boolean => !s.within || isIn(m, s.within, w) === true;
      const licks = (m: Moment): number => (m.lick ? 1 : 0);
      if (s.measure === 'licks') return sum(frames.filter(there), licks);
      if (s.measure === 'water given') return sum(frames, (m) => m.water);
      if (s.measure === 'laps done') return undefined;
      if (s.measure === 'share of licks') {
        const all = sum(frames, licks);
        return all === 0 ? undefined : sum(frames.filter(there), licks) / all;
      }
      // Every frame lasts 10 ms here, but the first of the session, which has none before it.
      const inside = frames.filter((m) => there(m) && m !== w.frames[0]);
      if (inside.length === 0) return undefined;
      return sum(inside, (m) => m.moved) / 25 / (inside.length * 0.01);
    }
  }
}

function measured(measure: string, w: World): Value {
  const now = w.frames.at(-1)!;
  const since = (begins: (m: Moment) => boolean): number =>
    now.timeUs - (w.frames.findLast(begins) ?? w.frames[0]!).timeUs;
  switch (measure) {
    case 'position':
      return now.counts === undefined ? undefined : now.counts / 25;
    case 'speed':
      return now.speed;
    case 'lap':
      return now.lap;
    case 'time':
      return now.timeUs - w.frames[0]!.timeUs;
    case 'phase time':
      return since((m) => m.phaseBegan);
    case 'lap time':
      return since((m) => m.lapBegan);
    default: {
      const begun = w.frames.findLastIndex((m) => m.phaseBegan);
      return w.frames.filter((m, n) => m.lapBegan && n >= Math.max(0, begun)).length;
    }
  }
}
