import type { RulesFile, Sum } from '../ast.js';
import type { RigFacts } from '../facts.js';
import { Names } from './names.js';
import type { Amount, GapSpec, PointSpec, SpanSpec } from './program.js';
import type { TallySpec } from './tally.js';

/** What compiling gathers: tables that the closures refer to by index, each thing in them once. */
export class Builder {
  readonly names: Names;
  readonly spans: SpanSpec[] = [];
  readonly points: PointSpec[] = [];
  readonly tallies: TallySpec[] = [];
  readonly gaps: GapSpec[] = [];
  marks = 0;
  readonly lickMarks: { span: number; mark: number }[] = [];
  readonly inputMarks: { input: number; rises: boolean; mark: number }[] = [];
  readonly phaseMarks: { phase: number; mark: number }[] = [];
  private readonly interned = new Map<string, number>();

  constructor(
    readonly file: RulesFile,
    readonly facts: RigFacts,
  ) {
    this.names = new Names(file, facts);
  }

  /** The index under a key, made when it is new. */
  private intern(key: string, make: () => number): number {
    let index = this.interned.get(key);
    if (index === undefined) {
      index = make();
      this.interned.set(key, index);
    }
    return index;
  }

  span(key: string, edges: () => { from: Amount; to: Amount; moving: boolean }): number {
    return this.intern(`span ${key}`, () => {
      const made = {
        ...edges(),
        tracked: false,
        enterRules: [],
        leaveRules: [],
        enterMarks: [],
        leaveMarks: [],
        visitDraws: [],
        visitTallies: [],
        visitNths: [],
      };
      return this.spans.push(made) - 1;
    });
  }

  point(key: string, place: () => { place: Amount; moving: boolean }): number {
    return this.intern(`point ${key}`, () => {
      return this.points.push({ ...place(), rules: [], marks: [] }) - 1;
    });
  }

  /** A mark, told by `hook` what to be set by when it is new. */
  mark(key: string, hook: (mark: number) => void): number {
    return this.intern(`mark ${key}`, () => {
      const mark = this.marks++;
      hook(mark);
      return mark;
    });
  }

  /** A tally that can be read over at least so many laps and so long. */
  tally(
    of: TallySpec['of'],
    subject: number,
    need: { visitOf?: number; laps?: number; windowUs?: number } = {},
  ): number {
    const visitOf = need.visitOf ?? -1;
    const index = this.intern(`tally ${of} ${subject} ${visitOf}`, () => {
      const made = this.tallies.push({ of, subject, visitOf, laps: 0, windowUs: 0 }) - 1;
      if (visitOf >= 0) {
        this.spans[visitOf]!.tracked = true;
        this.spans[visitOf]!.visitTallies.push(made);
      }
      return made;
    });
    const spec = this.tallies[index]!;
    spec.laps = Math.max(spec.laps, need.laps ?? 0);
    spec.windowUs = Math.max(spec.windowUs, need.windowUs ?? 0);
    return index;
  }
}

/** A piece of the tree as text, the same for two pieces that mean the same. */
export function keyOf(node: unknown): string {
  return JSON.stringify(node, (key, value) =>
    key === 'at' || key === 'written' ? undefined : value,
  );
}

/** Whether an amount can change without a phase, a draw or a choice changing. */
export function readsMeasure(node: Sum): boolean {
  switch (node.kind) {
    case 'negate':
      return readsMeasure(node.of);
    case 'binary':
      return readsMeasure(node.left) || readsMeasure(node.right);
    case 'quantity':
    case 'name':
    case 'edge':
      return false;
    default:
      return true;
  }
}
