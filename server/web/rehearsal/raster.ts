import type { OutputFacts } from '../../rules/facts.js';
import type { StampedDecision } from '../../session/decisions.js';
import type { RasterKind, RasterLap } from '../rules/rulesMessages.js';

/** Eight hours of a busy animal. */
const MOST_MARKS = 200_000;

/** Gathers from decisions what happened where, lap by lap, for a picture of a whole session. */
export class RasterCollector {
  readonly laps: { lap: number; mm: number[]; kinds: RasterKind[] }[] = [];
  leftOut = 0;
  #marks = 0;
  readonly #kinds: ReadonlyMap<string, OutputFacts['kind']>;

  constructor(outputs: readonly { readonly name: string; readonly kind: OutputFacts['kind'] }[]) {
    this.#kinds = new Map(outputs.map(({ name, kind }) => [name, kind]));
  }

  take(decision: StampedDecision): void {
    if (decision.kind === 'lap began') this.#lap(decision.lap);
    const kind = this.#kindOf(decision);
    const at =
      decision.kind === 'fired'
        ? (decision.riseCm ?? decision.placeCm ?? decision.positionCm)
        : decision.positionCm;
    if (kind === undefined || at === null) return;
    if (this.#marks >= MOST_MARKS) {
      this.leftOut++;
      return;
    }
    this.#marks++;
    const lap = this.#lap(decision.lap);
    lap.mm.push(Math.round(at * 10));
    lap.kinds.push(kind);
  }

  get result(): readonly RasterLap[] {
    return this.laps;
  }

  #kindOf(decision: StampedDecision): RasterKind | undefined {
    switch (decision.kind) {
      case 'lick':
        return decision.artefact ? 'artefact' : 'lick';
      case 'missed':
        return 'missed';
      case 'withheld':
      case 'refused':
        return 'withheld';
      case 'fired': {
        if (decision.sham) return 'sham';
        if (decision.output === null) return undefined;
        const drives = this.#kinds.get(decision.output);
        if (drives === 'valve') return 'water';
        return drives === 'mark' ? undefined : 'stimulus';
      }
      default:
        return undefined;
    }
  }

  /** Decisions come in the order of laps, but for what the board reports late. */
  #lap(lap: number): RasterCollector['laps'][number] {
    for (let n = this.laps.length - 1; n >= 0; n--) {
      if (this.laps[n]!.lap === lap) return this.laps[n]!;
      if (this.laps[n]!.lap < lap) {
        const fresh = { lap, mm: [], kinds: [] };
        this.laps.splice(n + 1, 0, fresh);
        return fresh;
      }
    }
    const first = { lap, mm: [], kinds: [] };
    this.laps.unshift(first);
    return first;
  }
}
