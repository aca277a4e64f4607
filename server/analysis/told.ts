import type { StampedDecision } from '../session/decisions.js';
import type { SessionData } from './readSession.js';

/** A decision in words. */
export interface Told {
  readonly input: number;
  readonly boardUs: number;
  readonly lap: number;
  readonly positionCm: number | null;
  readonly kind: StampedDecision['kind'];
  /** The rule or draw; empty where it is of none. */
  readonly rule: string;
  /** Why, or what: a reason, a value, a note's text; else its fields as JSON. */
  readonly detail: string;
}

/** What the tables of laps, licks, firings, water and phases are made of. */
const ELSEWHERE: ReadonlySet<StampedDecision['kind']> = new Set([
  ...(['lap began', 'lick', 'fired', 'pulse done', 'phase began'] as const),
]);

/** Every decision that is in no other table: what was not done and why, draws, notes, acts, trust. */
export function toldOf({ decisions }: SessionData): Told[] {
  return decisions
    .filter(({ kind }) => !ELSEWHERE.has(kind))
    .map((d) => ({
      ...{ input: d.input, boardUs: d.boardUs, lap: d.lap, positionCm: d.positionCm },
      ...{ kind: d.kind, rule: ruleOf(d), detail: detailOf(d) },
    }));
}

function ruleOf(d: StampedDecision): string {
  if (d.kind === 'drawn') return d.draw;
  return 'rule' in d ? (d.rule ?? '') : '';
}

function detailOf(d: StampedDecision): string {
  switch (d.kind) {
    case 'withheld':
    case 'missed':
    case 'refused':
    case 'uncertain':
    case 'disarmed':
    case 'session ended':
      return d.reason;
    case 'drawn':
      return String(d.value);
    case 'note':
      return d.mark ? `${d.text} (mark ${d.mark})`.trim() : d.text;
    case 'trust':
      return `${d.trust}: ${d.reason}`;
    default: {
      const { input: _, boardUs, lap, positionCm, speedCmPerS, kind, ...fields } = d;
      return JSON.stringify(fields);
    }
  }
}
