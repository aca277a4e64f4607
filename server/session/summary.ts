import type { StampedDecision } from './decisions.js';

/** What happened in a session, counted from its decisions alone. */
export interface SessionSummary {
  readonly rules: ReadonlyMap<string, RuleSummary>;
  laps: number;
  licks: number;
  waterNl: number;
  endedBecause: string;
  /** Cells after the first, with what was noted of each and the lap in which it began. */
  readonly cells: { readonly index: number; readonly lap: number; readonly fields: string }[];
  sessionUs: number;
}
export interface RuleSummary {
  fired: number;
  shams: number;
  /** Times withheld, missed, refused or uncertain, by reason. */
  readonly not: Map<string, number>;
  /** Distances from the place intended, mm: those that the board started, and those from the host. */
  readonly armedErrorsMm: number[];
  readonly hostErrorsMm: number[];
  /** A firing with several outputs is told once for each, and counted once. */
  readonly serials: Set<number>;
}

/** Gathers a summary as decisions come. */
export class Summariser {
  readonly #rules = new Map<string, RuleSummary>();
  readonly summary: SessionSummary = {
    rules: this.#rules,
    laps: 0,
    licks: 0,
    waterNl: 0,
    endedBecause: '',
    cells: [],
    sessionUs: 0,
  };
  #beganUs = 0;

  /** @param rules names in the order in which to show them, those that never fire included */
  constructor(rules: readonly string[]) {
    for (const name of rules) this.#of(name);
  }

  take(decision: StampedDecision): void {
    const { summary } = this;
    switch (decision.kind) {
      case 'session began':
        this.#beganUs = decision.boardUs;
        return;
      case 'session ended':
        summary.endedBecause = decision.reason;
        summary.sessionUs = decision.boardUs - this.#beganUs;
        return;
      case 'lap began':
        summary.laps = decision.lap;
        return;
      case 'cell began': {
        const { index, lap, fields } = decision;
        summary.cells.push({ index, lap, fields: fieldWords(fields) });
        return;
      }
      case 'lick':
        if (!decision.artefact) summary.licks++;
        return;
      case 'pulse done':
        summary.waterNl += decision.volumeNl;
        return;
      case 'fired':
        this.#fired(decision);
        return;
      case 'withheld':
      case 'missed':
      case 'refused':
      case 'uncertain': {
        const { not } = this.#of(decision.rule);
        const why = `${decision.kind}: ${decision.reason}`;
        not.set(why, (not.get(why) ?? 0) + 1);
        return;
      }
    }
  }

  #fired(decision: Extract<StampedDecision, { kind: 'fired' }>): void {
    const rule = this.#of(decision.rule);
    if (!rule.serials.has(decision.serial)) {
      rule.serials.add(decision.serial);
      if (decision.sham) rule.shams++;
      else rule.fired++;
    }
    if (decision.errorMm === null) return;
    (decision.armed ? rule.armedErrorsMm : rule.hostErrorsMm).push(decision.errorMm);
  }

  #of(name: string): RuleSummary {
    let rule = this.#rules.get(name);
    if (rule === undefined) {
      rule = {
        fired: 0,
        shams: 0,
        not: new Map(),
        armedErrorsMm: [],
        hostErrorsMm: [],
        serials: new Set(),
      };
      this.#rules.set(name, rule);
    }
    return rule;
  }
}

/** What was noted of a cell: `depth (um): 350; file name: a12`. */
export function fieldWords(fields: Readonly<Record<string, string>>): string {
  return Object.entries(fields)
    .map(([name, value]) => `${name}: ${value}`)
    .join('; ');
}

/** The summary in words, a line a fact. */
export function summaryLines(summary: SessionSummary): string[] {
  const minutes = (summary.sessionUs / 60_000_000).toFixed(1);
  const lines = [
    `${minutes} min, ${summary.laps} laps, ${summary.licks} licks, ${(summary.waterNl / 1_000).toFixed(1)} uL of water`,
    `ended: ${summary.endedBecause}`,
  ];
  for (const { index, lap, fields } of summary.cells) {
    lines.push(`  cell ${index} from lap ${lap}${fields === '' ? '' : `: ${fields}`}`);
  }
  for (const [name, rule] of summary.rules) {
    const shams = rule.shams > 0 ? `, ${rule.shams} as sham` : '';
    lines.push(`  ${name}: fired ${rule.fired}${shams}${errors(rule)}`);
    for (const [why, times] of rule.not) lines.push(`    ${times} times ${why}`);
  }
  return lines;
}

function errors(rule: RuleSummary): string {
  return (
    describe('started by the board', rule.armedErrorsMm) +
    describe('by the host', rule.hostErrorsMm)
  );
}

function describe(what: string, errorsMm: readonly number[]): string {
  if (errorsMm.length === 0) return '';
  const sorted = errorsMm.map(Math.abs).sort((a, b) => a - b);
  const median = sorted[Math.floor(sorted.length / 2)]!;
  return `; ${errorsMm.length} ${what}, ${median.toFixed(2)} mm from the place (median), ${sorted.at(-1)!.toFixed(2)} mm at most`;
}
