import type { FieldPrediction } from '../../server/plasticity/fieldPrediction.js';
import type { RulesFile } from '../../server/rules/ast.js';
import { compile } from '../../server/rules/engine/compile.js';
import { RulesEngine } from '../../server/rules/engine/rulesEngine.js';
import type { RigFacts } from '../../server/rules/facts.js';
import type {
  Actuator,
  ArmRequest,
  FiringRequest,
  Instant,
  Journal,
  Trust,
  Withheld,
} from '../../server/rules/instant.js';
import { parseRules } from '../../server/rules/text/parseRules.js';

/** A rig like that of the demo: 180 cm at 25 counts a centimetre, so 4500 counts a lap. */
export const FACTS: RigFacts = {
  beltLengthCm: 180,
  beltToleranceCm: 0.5,
  countsPerCm: 25,
  seamMark: true,
  slipAllowedCm: 3,
  stillBelowCmPerS: 1,
  hysteresisCm: 0.5,
  outputs: [
    {
      ...{ name: 'valve', index: 0, kind: 'valve', longestOnUs: 250_000, leastGapUs: 100_000 },
      valve: { deadUs: 8_000, usPerNl: 12, leastNl: 1_000, mostNl: 12_000 },
    },
    { name: 'laser', index: 1, kind: 'stimulus', longestOnUs: 3_000_000, leastGapUs: 20_000 },
    { name: 'lamp', index: 2, kind: 'stimulus', longestOnUs: 5_000_000, leastGapUs: 0 },
    { name: 'tone', index: 3, kind: 'stimulus', longestOnUs: 1_000_000, leastGapUs: 0 },
    { name: 'marker', index: 4, kind: 'mark', longestOnUs: 100_000, leastGapUs: 0 },
    { name: 'sync', index: 5, kind: 'mark', longestOnUs: 100_000, leastGapUs: 0 },
  ],
  inputs: [
    { name: 'spikes', index: 2 },
    { name: 'shutter', index: 3 },
  ],
};
export const LAP = 4500;
export const COUNTS_PER_CM = 25;
const START_US = 5_000_000;

/** Reads rules that a test gives as text. */
export function rulesOf(text: string): RulesFile {
  const whole = text.includes('belt:') ? text : `title: a test\nbelt: 180 cm\n${text}`;
  const { file, problems } = parseRules('test.yaml', () => Buffer.from(whole));
  if (!file || problems.some((p) => p.severity === 'error')) {
    throw new Error(`the test's own rules are wrong: ${JSON.stringify(problems, null, 1)}`);
  }
  return file;
}

/** One line of what the engine did, with the instant at which it did it. */
export interface Deed {
  readonly what:
    | 'fired'
    | 'sham'
    | 'withheld'
    | 'missed'
    | 'stop'
    | 'armed'
    | 'disarmed'
    | 'end'
    | 'drawn'
    | 'phase'
    | 'cell'
    | 'note';
  readonly name: string;
  readonly ms: number;
  readonly lap: number;
  readonly cm: number;
  readonly value?: number | string;
}

export interface StageOptions {
  readonly seed?: string;
  readonly facts?: RigFacts;
  /** Where the belt stands at first, in cm of the part lap before lap 1. */
  readonly startCm?: number;
  /** Milliseconds from frame to frame. */
  readonly frameMs?: number;
}

/**
 * An engine on a belt that follows the test's word: no slip, no noise, board answers at the next
 * frame. What it does is collected in `deeds`.
 */
export class Stage implements Actuator, Journal {
  readonly deeds: Deed[] = [];
  readonly chosenSoFar: { choice: number; value: number | string; lap: number }[] = [];
  /** What the session's end announced of itself, and in which lap. */
  readonly foreseen: { lap: number; laps: number; us: number; exact: boolean; what: string }[] = [];
  readonly requests: FiringRequest[] = [];
  readonly fields: ({ rule: string; serial: number; lap: number } & FieldPrediction)[] = [];
  readonly armed = new Map<number, ArmRequest>();
  readonly engine: RulesEngine;
  readonly instant: Instant;
  readonly file: RulesFile;
  /** What the guard says to a firing; undefined agrees. */
  guard: (request: FiringRequest) => Withheld = () => undefined;
  /** Whether slots can be had, and then whether the board fires them at the crossing. */
  slots = false;
  boardFires = true;
  /** What becomes of host firings: the board's word comes before the next frame. */
  outcome: 'fired' | 'not fired' | 'uncertain' | 'later' = 'fired';
  trust: Trust = 'trusted';
  ended = '';
  travel: number;
  private progress: number;
  private readonly frameUs: number;
  private readonly toSettle: FiringRequest[] = [];
  private lickNext = false;
  private levels = 0;
  private rose = 0;
  private fell = 0;
  private began = false;
  private correction = 0;

  constructor(rules: string | RulesFile, options: StageOptions = {}) {
    this.file = typeof rules === 'string' ? rulesOf(rules) : rules;
    const facts = options.facts ?? FACTS;
    this.frameUs = (options.frameMs ?? 10) * 1000;
    this.engine = new RulesEngine(compile(this.file, facts), options.seed ?? 'seed', this, this);
    this.travel = facts.seamMark ? (options.startCm ?? 170) * COUNTS_PER_CM : LAP;
    this.progress = this.travel;
    this.instant = {
      nowUs: START_US - this.frameUs,
      trust: 'unknown',
      placed: false,
      lapCounts: LAP,
      travelFrom: this.travel,
      travelTo: this.travel,
      progressFrom: this.progress,
      progressTo: this.progress,
      positionCm: Number.NaN,
      speedCmPerS: 0,
      lap: 0,
      lapBegan: false,
      lick: false,
      inputs: 0,
      rose: 0,
      fell: 0,
    };
  }

  /** Session time, milliseconds. */
  get ms(): number {
    return (this.instant.nowUs - START_US) / 1000;
  }

  // ---- what the animal and the operator do ---------------------------------------------------

  begin(): this {
    this.frame(0);
    return this;
  }

  /** One frame in which the belt moves by so many counts. */
  frame(counts: number): void {
    if (this.ended !== '') return;
    const i = this.instant;
    i.nowUs += this.frameUs;
    this.travel += this.correction;
    if (this.correction < 0 && this.progress === this.travel - this.correction) {
      this.progress = this.travel;
    }
    if (this.travel > this.progress) this.progress = this.travel;
    this.correction = 0;
    i.travelFrom = this.travel;
    i.progressFrom = this.progress;
    this.travel += counts;
    this.progress = Math.max(this.progress, this.travel);
    i.travelTo = this.travel;
    i.progressTo = this.progress;
    const lap = Math.floor(this.progress / LAP);
    i.lapBegan = lap > i.lap;
    if (i.lapBegan && !i.placed) {
      i.placed = true;
      i.travelFrom = Math.max(i.travelFrom, lap * LAP - 1);
      i.progressFrom = Math.max(i.progressFrom, lap * LAP - 1);
    }
    i.lap = lap;
    i.trust = i.placed ? this.trust : 'unknown';
    i.positionCm = i.placed
      ? (this.travel - Math.floor(this.travel / LAP) * LAP) / COUNTS_PER_CM
      : Number.NaN;
    i.speedCmPerS = ((counts / COUNTS_PER_CM) * 1e6) / this.frameUs;
    i.lick = this.lickNext;
    i.inputs = this.levels;
    i.rose = this.rose;
    i.fell = this.fell;
    this.lickNext = false;
    this.rose = 0;
    this.fell = 0;
    if (this.began) this.engine.step(i);
    else this.engine.begin(i);
    this.began = true;
    this.board(i);
  }

  /** Runs to a place on the unrolled belt (cm; lap 1 begins at 180) at a speed. */
  runTo(cm: number, cmPerS = 20): this {
    if (!this.began) this.begin();
    const target = Math.round(cm * COUNTS_PER_CM);
    const step = Math.max(1, Math.round((cmPerS * COUNTS_PER_CM * this.frameUs) / 1e6));
    while (this.travel !== target && this.ended === '') {
      const left = target - this.travel;
      this.frame(left > 0 ? Math.min(step, left) : Math.max(-step, left));
    }
    return this;
  }

  /** Runs to a place within a lap. */
  to(lap: number, cm: number, cmPerS = 20): this {
    return this.runTo(lap * 180 + cm, cmPerS);
  }

  /** Stands for so long. */
  wait(ms: number): this {
    if (!this.began) this.begin();
    const frames = Math.round((ms * 1000) / this.frameUs);
    for (let n = 0; n < frames; n++) this.frame(0);
    return this;
  }

  /** Licks so often, each at a frame of its own and so far apart. */
  lick(times = 1, apartMs = 100): this {
    if (!this.began) this.begin();
    for (let n = 0; n < times; n++) {
      if (n > 0) this.wait(apartMs - this.frameUs / 1000);
      this.lickNext = true;
      this.frame(0);
    }
    return this;
  }

  input(index: number, high: boolean): this {
    this.inputAtNextFrame(index, high);
    this.frame(0);
    return this;
  }

  lickAtNextFrame(): void {
    this.lickNext = true;
  }

  inputAtNextFrame(index: number, high: boolean): void {
    const bit = 1 << index;
    if (high) this.rose |= bit;
    else this.fell |= bit;
    this.levels = high ? this.levels | bit : this.levels & ~bit;
  }

  press(button: string): this {
    this.engine.press(button);
    this.frame(0);
    return this;
  }

  /** The seam mark corrects the position by so many cm at the next frame. */
  correct(cm: number): this {
    this.correction = Math.round(cm * COUNTS_PER_CM);
    return this;
  }

  // ---- what was done -------------------------------------------------------------------------

  /** Firings of a rule, both kinds. */
  firings(name?: string): Deed[] {
    return this.deeds.filter(
      (d) => (d.what === 'fired' || d.what === 'sham') && (name === undefined || d.name === name),
    );
  }
  /** The unrolled place of a deed, to within the lap that was being run, counts. */
  travelAt(deed: Deed): number {
    return deed.lap * LAP + (Number.isNaN(deed.cm) ? 0 : deed.cm * COUNTS_PER_CM);
  }
  /** Laps on which a rule fired. */
  laps(name: string): number[] {
    return this.firings(name).map((d) => d.lap);
  }
  /** Places at which a rule fired, cm. */
  places(name: string): number[] {
    return this.firings(name).map((d) => d.cm);
  }
  /** Session times at which a rule fired, ms. */
  times(name: string): number[] {
    return this.firings(name).map((d) => d.ms);
  }
  of(what: Deed['what']): Deed[] {
    return this.deeds.filter((d) => d.what === what);
  }

  private deed(what: Deed['what'], name: string, value?: number | string): void {
    const { lap, positionCm: cm } = this.instant;
    const rest = value === undefined ? {} : { value };
    this.deeds.push({ what, name, ms: this.ms, lap, cm, ...rest });
  }
  rule(index: number): string {
    return this.file.rules[index]!.name.name;
  }

  // ---- the board -----------------------------------------------------------------------------

  private board(i: Instant): void {
    for (const [rule, request] of this.armed) {
      const { placeTravel } = request;
      if (!(i.travelFrom < placeTravel && i.travelTo >= placeTravel)) continue;
      this.armed.delete(rule);
      if (this.boardFires) {
        this.engine.settle(rule, request.serial, 'fired', i);
        this.give(request);
      } else this.engine.settle(rule, request.serial, 'not fired', i);
    }
    if (this.outcome === 'later') this.toSettle.length = 0;
    for (const request of this.toSettle.splice(0)) this.settle(request, this.outcome as 'fired');
  }

  settle(request: FiringRequest, how: 'fired' | 'not fired' | 'uncertain'): void {
    this.engine.settle(request.rule, request.serial, how, this.instant);
    if (how === 'fired') this.give(request);
  }

  private give(request: FiringRequest): void {
    for (const order of request.orders) if (order.volumeNl > 0) this.engine.drop(order.volumeNl);
  }

  // ---- Actuator ------------------------------------------------------------------------------

  fire(request: FiringRequest): Withheld {
    const reason = this.guard(request);
    if (reason !== undefined) return reason;
    this.requests.push(request);
    if (!request.sham) {
      this.deed('fired', this.rule(request.rule), request.serial);
      this.toSettle.push(request);
    }
    return undefined;
  }
  arm(request: ArmRequest): Withheld {
    if (!this.slots) return 'no slot is free';
    this.armed.set(request.rule, request);
    this.deed('armed', this.rule(request.rule), request.placeTravel / COUNTS_PER_CM);
    return undefined;
  }
  disarm(rule: number): void {
    const request = this.armed.get(rule);
    this.armed.delete(rule);
    this.deed('disarmed', this.rule(rule));
    if (request) this.engine.settle(rule, request.serial, 'not fired', this.instant);
  }
  stop(output: number): void {
    this.deed('stop', FACTS.outputs[output]!.name);
  }
  endSession(reason: string): void {
    this.ended = reason;
    this.deed('end', '', reason);
  }

  // ---- Journal -------------------------------------------------------------------------------

  fired(rule: number, serial: number, sham: boolean, armed: boolean): void {
    if (sham) this.deed('sham', this.rule(rule), serial);
    else if (armed || !this.requests.some((r) => r.rule === rule && r.serial === serial)) {
      this.deed('fired', this.rule(rule), serial);
    }
  }
  withheld(rule: number, _serial: number, reason: string): void {
    this.deed('withheld', this.rule(rule), reason);
  }
  missed(rule: number, _serial: number, reason: string): void {
    this.deed('missed', this.rule(rule), reason);
  }
  drawn(draw: string, _scope: string, _index: number, value: number | string): void {
    this.deed('drawn', draw, value);
  }
  phaseBegan(phase: string): void {
    this.deed('phase', phase);
  }
  cellBegan(index: number): void {
    this.deed('cell', '', index);
  }
  endForeseen(laps: number, us: number, exact: boolean, what: string): void {
    this.foreseen.push({ lap: this.instant.lap, laps, us, exact, what });
  }
  chosen(choice: number, value: number | string): void {
    this.chosenSoFar.push({ choice, value, lap: this.instant.lap });
  }
  fieldPredicted(rule: number, serial: number, field: FieldPrediction): void {
    this.fields.push({ rule: this.rule(rule), serial, lap: this.instant.lap, ...field });
  }
  noted(rule: number): void {
    this.deed('note', this.rule(rule));
  }
}
