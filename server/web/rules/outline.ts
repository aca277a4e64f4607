import type { Located, Moment, RuleDecl, RulesFile, SpanExpr, Sum, When } from '../../rules/ast.js';
import { intervalOf, spotsOf } from '../../rules/checks/interval.js';
import type { Symbols } from '../../rules/checks/symbols.js';
import { walk } from '../../rules/checks/walk.js';
import { lineColumn } from '../../rules/formatProblems.js';
import { printCourse, printSpot } from '../../rules/print.js';
import { printAction, printWhen } from '../../rules/printRule.js';
import type { BeltStretch, Outlined, RulesOutline } from './rulesMessages.js';

/**
 * Where on the belt a file's places and rules are, and where in the text they stand.
 * @param placed false while names go in circles: then nothing is reckoned, only listed
 */
export function outlineOf(file: RulesFile, symbols: Symbols, placed: boolean): RulesOutline | null {
  const beltCm = file.beltLengthCm.value;
  const belt = new Belt(symbols, beltCm, placed && Number.isFinite(beltCm));
  const text = file.sources[0]!.text;
  const outlined = (
    decl: Located & { readonly name: { readonly name: string } },
    words: string,
    spots: readonly BeltStretch[],
  ): Outlined[] => {
    // What an included file declares has no line here.
    if (decl.at.file !== 0) return [];
    const { start: from, end: to } = decl.at;
    const { line } = lineColumn(text, from);
    return [{ name: decl.name.name, line, from, to, words: words.slice(0, 300), spots }];
  };
  return {
    title: file.title,
    beltCm: Number.isFinite(beltCm) ? beltCm : symbols.rig?.beltLengthCm || 0,
    places: file.places.flatMap((decl) =>
      outlined(decl, printSpot(decl.place.base), belt.named(decl.name.name)),
    ),
    rules: file.rules.flatMap((rule) => {
      const words = `${printWhen(rule.when)}: ${rule.do.map(printAction).join(', ')}`;
      return outlined(rule, words, belt.ofRule(rule));
    }),
    phases: file.phases.flatMap((decl) => outlined(decl, printCourse(decl), [])),
  };
}

class Belt {
  constructor(
    private readonly symbols: Symbols,
    private readonly lengthCm: number,
    private readonly placed: boolean,
  ) {}

  /** Of a name: every spot that it may stand for, in any phase. */
  named(name: string): BeltStretch[] {
    if (!this.placed) return [];
    return this.unique(
      spotsOf(name, this.symbols).map(({ from, to }) =>
        to === undefined ? this.point(from) : this.span(from, to),
      ),
    );
  }

  /** Of a rule: where its moment is; failing that, where its condition holds. */
  ofRule(rule: RuleDecl): BeltStretch[] {
    if (!this.placed) return [];
    const moment = this.ofWhen(rule.when);
    return moment.length > 0 || !rule.if ? moment : this.spansIn(rule.if);
  }

  private ofWhen(when: When | Moment): BeltStretch[] {
    switch (when.kind) {
      case 'after':
        return this.ofWhen(when.moment);
      case 'reaches':
        return this.reached(when.place);
      case 'every row': {
        const table = this.symbols.get(when.table.name);
        if (table?.kind !== 'table' || table.decl.rows.kind !== 'places') return [];
        const places = [...new Set(table.decl.rows.placeCm)].slice(0, 50);
        return places.map((cm) => ({ fromCm: cm, toCm: cm, kind: 'point' }));
      }
      default:
        return this.spansIn(when);
    }
  }

  /** A point by itself, or each that a name may stand for. */
  private reached(place: Sum): BeltStretch[] {
    if (place.kind === 'name') {
      const named = this.named(place.name);
      if (named.length > 0) return named;
    }
    return this.unique([this.point(place)]);
  }

  private spansIn(piece: unknown): BeltStretch[] {
    const found: (BeltStretch | undefined)[] = [];
    walk(piece, (node, key) => {
      if (node.kind === 'is range' && !node.negated) {
        const { subject, from, to } = node as unknown as Record<'subject' | 'from' | 'to', Sum>;
        const position = subject.kind === 'measure' && subject.measure === 'position';
        if (position) found.push(this.span(from, to));
        return !position;
      }
      if (key !== 'span' && key !== 'within') return true;
      const span = node as unknown as SpanExpr;
      if (span.kind === 'name') found.push(...this.named(span.name));
      else if (span.kind === 'range') found.push(this.span(span.from, span.to));
      return false;
    });
    return this.unique(found);
  }

  private point(sum: Sum): BeltStretch | undefined {
    const { low, high } = intervalOf(sum, this.symbols);
    if (!this.on(low) || !this.on(high)) return undefined;
    return { fromCm: low, toCm: high, kind: low === high ? 'point' : 'somewhere' };
  }

  private span(from: Sum, to: Sum): BeltStretch | undefined {
    const first = intervalOf(from, this.symbols);
    const last = intervalOf(to, this.symbols);
    if (![first.low, first.high, last.low, last.high].every((cm) => this.on(cm))) return undefined;
    return { fromCm: first.low, toCm: last.high, kind: 'span' };
  }

  private on(cm: number): boolean {
    return cm >= 0 && cm <= this.lengthCm;
  }

  private unique(stretches: readonly (BeltStretch | undefined)[]): BeltStretch[] {
    const known = new Map<string, BeltStretch>();
    for (const one of stretches) if (one) known.set(`${one.kind} ${one.fromCm} ${one.toCm}`, one);
    return [...known.values()].slice(0, 50);
  }
}
