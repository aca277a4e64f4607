import type { RulesFile } from '../rules/ast.js';
import { uniform } from '../rules/engine/hash.js';
import type { StampedDecision } from '../session/decisions.js';
import type { Rig } from '../session/rig/rig.js';
import { Summariser } from '../session/summary.js';
import { type Declines, Inquest } from './inquest.js';
import { type LapLicks, LapLicksCollector } from './lapLicks.js';
import { type Latency, latencyAt } from './latency.js';

/** What one rehearsed session came to: plain data, to be sent between processes. */
export interface RunResult {
  readonly run: number;
  readonly sessionS: number;
  readonly laps: number;
  readonly licks: number;
  readonly waterUl: number;
  readonly endedBecause: string;
  /** 1 for each alternative of `end` that was true as the rules ended it. */
  readonly ends: readonly number[];
  readonly rules: readonly RunRule[];
  readonly phases: readonly RunPhase[];
  /** Of each draw, how often each value was drawn; beyond 200 values the rest is not told apart. */
  readonly draws: readonly { readonly name: string; readonly values: readonly DrawnValue[] }[];
  readonly lapLicks: readonly LapLicks[];
}
export type DrawnValue = readonly [value: number | string, times: number];

export interface RunRule extends Declines {
  readonly fired: number;
  readonly shams: number;
  /** Firings, shams left out, in each phase of the file; one entry where it has no phases. */
  readonly byPhase: readonly number[];
  /** Times withheld, missed, refused or uncertain, by reason; numbers that vary are left out. */
  readonly not: readonly (readonly [reason: string, times: number])[];
  /**
   * True distance of the belt from the place intended, the encoder's slip included, mm: started by
   * the board, and by the host after its latency.
   */
  readonly boardMm: readonly number[];
  readonly hostMm: readonly number[];
}

export interface RunPhase {
  readonly entered: number;
  readonly left: number;
  readonly seconds: number;
}

const MOST_VALUES = 200;

/** Gathers one session's result as its decisions come. */
export class RunCollector {
  readonly inquest: Inquest;
  readonly #summariser: Summariser;
  readonly #lapLicks: LapLicksCollector;
  readonly #rules: { byPhase: number[]; boardMm: number[]; hostMm: number[] }[];
  readonly #index: ReadonlyMap<string, number>;
  readonly #phases: { entered: number; left: number; seconds: number }[];
  readonly #phaseIndex: ReadonlyMap<string, number>;
  readonly #draws: Map<string, Map<number | string, number>>;
  #phase = -1;
  #phaseUs = 0;
  #hostFirings = 0;
  /** Where the belt truly was at rises not yet told of, by time. */
  readonly #rises = new Map<number, number>();

  /** @param latency added to firings that the host decided, drawn anew for each from `seed` */
  constructor(
    file: RulesFile,
    private readonly rig: Rig,
    private readonly run: number,
    private readonly seed: string,
    private readonly latency: Latency,
  ) {
    const names = file.rules.map(({ name }) => name.name);
    this.inquest = new Inquest(file);
    this.#summariser = new Summariser(names);
    const valves = rig.outputs.filter(({ kind }) => kind === 'valve').map(({ name }) => name);
    this.#lapLicks = new LapLicksCollector(rig.belt.lengthCm, valves);
    this.#rules = names.map(() => ({
      byPhase: new Array(Math.max(1, file.phases.length)).fill(0),
      boardMm: [],
      hostMm: [],
    }));
    this.#index = new Map(names.map((name, n) => [name, n]));
    this.#phases = file.phases.map(() => ({ entered: 0, left: 0, seconds: 0 }));
    this.#phaseIndex = new Map(file.phases.map(({ name }, n) => [name.name, n]));
    this.#draws = new Map(file.draws.map(({ name }) => [name.name, new Map()]));
  }

  /** An output rose, at board time `us`, where the belt truly stood at `cm`. */
  rose(us: number, cm: number): void {
    this.#rises.set(us, cm);
  }

  readonly take = (decision: StampedDecision): void => {
    switch (decision.kind) {
      case 'fired':
        this.#fired(decision);
        break;
      case 'phase began':
        this.#leavePhase(decision.boardUs, true);
        this.#phase = this.#phaseIndex.get(decision.phase) ?? -1;
        this.#phaseUs = decision.boardUs;
        if (this.#phase >= 0) this.#phases[this.#phase]!.entered++;
        break;
      case 'session ended':
        this.#leavePhase(decision.boardUs, false);
        break;
      case 'drawn':
        this.#drawn(decision.draw, decision.value);
        break;
    }
    if (decision.kind !== 'fired') this.#summariser.take(decision);
    this.#lapLicks.take(decision);
  };

  get result(): RunResult {
    const { rules, laps, licks, waterNl, endedBecause, sessionUs } = this.#summariser.summary;
    return {
      ...{ run: this.run, sessionS: sessionUs / 1e6, laps, licks, waterUl: waterNl / 1_000 },
      ...{ endedBecause, ends: this.inquest.ends },
      rules: [...rules.values()].slice(0, this.#rules.length).map(({ fired, shams, not }, n) => ({
        ...{ fired, shams, ...this.#rules[n]!, ...this.inquest.declines[n]! },
        not: merged([...not]),
      })),
      phases: this.#phases,
      draws: [...this.#draws].map(([name, values]) => ({ name, values: [...values] })),
      lapLicks: this.#lapLicks.laps,
    };
  }

  #fired(decision: Extract<StampedDecision, { kind: 'fired' }>): void {
    const summary = this.#summariser.summary.rules.get(decision.rule);
    const before = summary?.fired ?? 0;
    this.#summariser.take(decision);
    const rule = this.#rules[this.#index.get(decision.rule) ?? -1];
    if (rule === undefined || summary === undefined) return;
    if (summary.fired > before) rule.byPhase[Math.max(0, this.#phase)]!++;
    const { armed, speedCmPerS } = decision;
    const errorMm = this.#errorMm(decision);
    if (errorMm === null) return;
    if (armed) {
      rule.boardMm.push(errorMm);
      return;
    }
    const share = uniform(this.seed, 'latency', '', this.#hostFirings++, 0);
    const lateS = latencyAt(this.latency, share) / 1e6;
    rule.hostMm.push(errorMm + speedCmPerS * lateS * 10);
  }

  #errorMm({ riseUs, placeCm, errorMm }: Extract<StampedDecision, { kind: 'fired' }>) {
    const cm = riseUs === null ? undefined : this.#rises.get(riseUs);
    if (riseUs === null || placeCm === null || cm === undefined) return errorMm;
    this.#rises.delete(riseUs);
    const half = this.rig.belt.lengthCm / 2;
    const off = cm - placeCm;
    // The nearer way round: a place at the seam may be met on either side of it.
    return 10 * (off > half ? off - 2 * half : off < -half ? off + 2 * half : off);
  }

  #leavePhase(us: number, left: boolean): void {
    const phase = this.#phases[this.#phase];
    if (phase === undefined) return;
    phase.seconds += (us - this.#phaseUs) / 1e6;
    if (left) phase.left++;
    this.#phase = -1;
  }

  #drawn(draw: string, value: number | string): void {
    const values = this.#draws.get(draw);
    if (values === undefined) return;
    const key = values.has(value) || values.size < MOST_VALUES ? value : 'others';
    values.set(key, (values.get(key) ?? 0) + 1);
  }
}

/** Reasons that differ in their numbers alone, as one. */
function merged(reasons: readonly (readonly [string, number])[]): [string, number][] {
  const sums = new Map<string, number>();
  for (const [reason, times] of reasons) {
    const key = alike(reason);
    sums.set(key, (sums.get(key) ?? 0) + times);
  }
  return [...sums];
}

/** A guard's reason without what was asked and what was left, which differ each time. */
function alike(reason: string): string {
  return reason
    .replace(/: [^:,]* asked, .*? left of /, ': not enough left of ')
    .replace(
      /: [^:,]* after its last pulse, (.*) is its least gap/,
      ': sooner than its least gap, $1',
    );
}
