import type { Sealed } from '../../rules/sealed.js';
import type { StampedDecision } from '../decisions.js';

/** Firings are told to this, so that their time does not say who started them: board or host. */
const COARSE_US = 100_000;
const COARSE_INPUTS = 100;

type Fired = Extract<StampedDecision, { kind: 'fired' }>;

/**
 * What a blinded session shows of its decisions: a firing of a rule that may be sham looks the same
 * whether it was, and what only a real one brings is left out. What the board refused, missed or
 * cannot account for is shown, and may tell the arm: a stimulus that fails must not be hidden.
 */
export class Mask {
  /** What each blinded rule drives first, which its firings are shown to have driven. */
  readonly #rules: ReadonlyMap<string, string | null>;
  readonly #outputs: ReadonlySet<string>;
  readonly #draw: string;
  readonly #seen = new Map<string, Set<number>>();

  constructor({ rules, outputs, draw }: Sealed) {
    this.#rules = new Map(rules.map(({ name, drives }) => [name, drives]));
    this.#outputs = new Set(outputs);
    this.#draw = draw;
  }

  hidesRule(rule: string): boolean {
    return this.#rules.has(rule);
  }

  hidesOutput(output: string): boolean {
    return this.#outputs.has(output);
  }

  /** Firings of a rule shown so far. */
  firings(rule: string): number {
    return this.#seen.get(rule)?.size ?? 0;
  }

  /** The decision as it may be shown; undefined where it may not. */
  shown(decision: StampedDecision): StampedDecision | undefined {
    switch (decision.kind) {
      case 'fired':
        return this.#rules.has(decision.rule) ? this.#firing(decision) : decision;
      case 'asked':
      case 'armed':
      case 'disarmed':
      case 'field predicted':
        return this.#rules.has(decision.rule) ? undefined : decision;
      case 'pulse done': {
        const { rule, output } = decision;
        const hidden = rule === null ? this.#outputs.has(output) : this.#rules.has(rule);
        return hidden ? undefined : decision;
      }
      case 'choice':
        // Only where something is real has the board anything to confirm.
        return decision.state === 'armed anew' ? undefined : decision;
      case 'drawn':
        return decision.draw === this.#draw ? { ...decision, value: 'sealed' } : decision;
      default:
        return decision;
    }
  }

  /** One a serial, whatever was driven, and no finer in time and place than both kinds have it. */
  #firing(decision: Fired): Fired | undefined {
    const { kind, rule, serial, placeCm, input, lap, positionCm, speedCmPerS } = decision;
    let seen = this.#seen.get(rule);
    if (seen === undefined) {
      seen = new Set();
      this.#seen.set(rule, seen);
    }
    if (seen.has(serial)) return undefined;
    seen.add(serial);
    const atUs = decision.riseUs ?? decision.boardUs;
    return {
      ...{ kind, rule, serial: seen.size, placeCm, lap },
      ...{ sham: false, armed: false, riseUs: null, riseCm: null, errorMm: null },
      output: this.#rules.get(rule) ?? null,
      input: coarse(input, COARSE_INPUTS),
      boardUs: coarse(atUs, COARSE_US),
      positionCm: placeCm ?? (positionCm === null ? null : Math.round(positionCm)),
      speedCmPerS: Math.round(speedCmPerS),
    };
  }
}

/** All of a record's decisions as they may be shown, in the order of what is shown of their times. */
export function maskedDecisions(
  decisions: readonly StampedDecision[],
  mask: Mask,
): StampedDecision[] {
  return decisions
    .flatMap((decision) => mask.shown(decision) ?? [])
    .sort((a, b) => a.boardUs - b.boardUs);
}

function coarse(value: number, step: number): number {
  return Math.floor(value / step) * step;
}
