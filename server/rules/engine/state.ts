import type { Instant } from '../instant.js';
import { Draw } from './draw.js';
import type { Program } from './program.js';
import { ReachTracker, RowTracker } from './reachTracker.js';
import { RuleState } from './ruleState.js';
import { SpanTracker } from './spanTracker.js';
import { type StretchStamp, Tally } from './tally.js';

/** When something last happened. */
export class Mark {
  atUs = Number.NEGATIVE_INFINITY;
  lap = Number.NEGATIVE_INFINITY;
}

/** An operator's choice: what it is, and what it will be. */
export class Choice {
  queued = false;
  queuedValue = 0;
  queuedOption = -1;

  constructor(
    public value: number,
    public option: number,
  ) {}
}

/** All that a session's rules remember between instants; the compiled closures read it. */
export class State {
  instant: Instant;
  nowUs: number;
  prevUs: number;
  readonly startUs: number;
  phaseUs: number;
  lapUs: number;
  lap = 0;
  /** Index of the phase, -1 in a file without phases. */
  phase = -1;
  cell = 0;
  /** Laps, phases and cells begun, counted from the start of the session. */
  lapOrdinal = 0;
  phaseOrdinal = 0;
  cellOrdinal = 0;
  /** The lap ordinal at which the phase's part lap counts from: its phase lap is the difference. */
  phaseLapBase = 0;
  cellLapBase = 0;
  placed = false;
  /** Travel at the end of the last instant. */
  travel = Number.NaN;
  progress = Number.NaN;
  /** Counts since the belt's 0 cm. */
  relativeCounts = Number.NaN;
  lapCounts = 1;
  /** Counts to a centimetre on this belt as measured: `lapCounts` over the belt's length. */
  countsPerCm = 1;

  /** When the board last reported a drop done. */
  dropUs = Number.NEGATIVE_INFINITY;

  readonly draws: Draw[];
  readonly choices: Choice[];
  readonly spans: SpanTracker[];
  readonly points: ReachTracker[];
  readonly tallies: Tally[];
  readonly marks: Mark[];
  readonly rules: RuleState[];

  constructor(
    readonly program: Program,
    readonly seed: string,
    instant: Instant,
  ) {
    this.instant = instant;
    this.nowUs = instant.nowUs;
    this.prevUs = instant.nowUs;
    this.startUs = instant.nowUs;
    this.phaseUs = instant.nowUs;
    this.lapUs = instant.nowUs;
    this.draws = program.draws.map((spec) => new Draw(spec, seed, program.facts.beltLengthCm));
    this.choices = program.choices.map((spec) => new Choice(spec.first.value, spec.first.option));
    this.spans = program.spans.map(() => new SpanTracker());
    this.points = program.points.map(() => new ReachTracker());
    this.tallies = program.tallies.map((spec) => new Tally(spec, instant.nowUs));
    this.marks = Array.from({ length: program.marks }, () => new Mark());
    this.rules = program.rules.map((spec) => {
      const rows =
        spec.when.kind === 'places' ? new RowTracker(spec.when.lap, spec.when.placeCm) : undefined;
      return new RuleState(spec, rows);
    });
  }

  /** The number of this lap in the phase; 0 in the part lap before the first whole one. */
  phaseLap(): number {
    return this.lapOrdinal - this.phaseLapBase;
  }

  stamp(): StretchStamp {
    return {
      timeUs: this.nowUs,
      lapOrdinal: this.lapOrdinal,
      phaseOrdinal: this.phaseOrdinal,
      cellOrdinal: this.cellOrdinal,
    };
  }
}
