import type { Actuator, Inquiry, Instant, Journal, Settlement } from '../instant.js';
import { ArmingPass } from './arming.js';
import { Asking } from './asking.js';
import { Course } from './course.js';
import { Ending } from './ending.js';
import { Firing } from './firing.js';
import { Licking } from './licking.js';
import { Motion } from './motion.js';
import { Movement } from './movement.js';
import type { Program } from './program.js';
import { NEXT, PREVIOUS, REPEAT, Run } from './run.js';
import { State } from './state.js';
import { TRUE } from './truth.js';
import { Turns } from './turns.js';
import { type EngineView, viewOf } from './view.js';

/**
 * Runs a compiled rules file over a session's instants. Pure: it has no clock, no randomness and no
 * I/O of its own, so that the same calls give the same commands.
 */
export class RulesEngine {
  private parts: Parts | undefined;

  /** @param seed every draw and chance of the session follows from it */
  constructor(
    private readonly program: Program,
    private readonly seed: string,
    private readonly actuator: Actuator,
    private readonly journal: Journal,
    private readonly inquiry?: Inquiry,
  ) {}

  /** The session begins with this instant, and its rules are asked at it. */
  begin(instant: Instant): void {
    const state = new State(this.program, this.seed, instant);
    this.parts = new Parts(new Run(state, this.actuator, this.journal, this.inquiry));
    this.parts.instant(instant, true);
  }

  /** One frame of the board. Does nothing before `begin` and after the session's end. */
  step(instant: Instant): void {
    if (this.parts !== undefined) this.parts.instant(instant, false);
  }

  /** What became of a firing that was asked or armed. Not from within `fire` or `arm`. */
  settle(rule: number, serial: number, how: Settlement, _instant: Instant): void {
    this.parts?.settle(rule, serial, how);
  }

  /** The board reports a drop done, a rule's or the operator's. */
  drop(volumeNl: number): void {
    this.parts?.drop(volumeNl);
  }

  /** The output has fallen: nothing holds it any more. */
  outputIdle(output: number): void {
    this.parts?.outputIdle(output);
  }

  /** The operator presses a button: a moment at the next instant. */
  press(button: string): void {
    this.parts?.press(button);
  }

  /**
   * The operator chooses: in force at the next instant, or as the next lap begins if it moves a
   * place. An amount is in base units.
   * @returns false when the session has no such choice, or the value is out of its bounds
   */
  choose(name: string, value: number | string): boolean {
    return this.parts?.course.choose(name, value) ?? false;
  }

  /** The operator changes the phase, at the next instant. */
  goTo(phase: string): void {
    this.parts?.goTo(phase);
  }

  /**
   * The operator asks for a rule: in the next so many laps its `if` and `chance` are taken as true;
   * 0 laps fires it at the next instant. Replaces what was asked of it before.
   * @returns false when the file does not let the rule be asked for so
   */
  ask(rule: string, laps: number): boolean {
    return this.parts?.asking.ask(rule, laps) ?? false;
  }

  /** Takes back what was asked of a rule. @returns false when nothing was */
  withdraw(rule: string): boolean {
    return this.parts?.asking.withdraw(rule) ?? false;
  }

  /**
   * Puts off the end, by `end` or by the last phase, once it has come.
   * @returns false beyond what may be put off in one session
   */
  putOff(laps: number, minutes: number): boolean {
    return this.parts?.ending.putOff(laps, minutes) ?? false;
  }

  /** The operator starts again for the next cell, at the next instant. */
  newCell(): void {
    this.parts?.course.askCell();
  }

  /** The number of the cell, from 1; one that was asked for is counted in. */
  get cell(): number {
    return this.parts?.course.cell ?? 0;
  }

  /** Travel, counts, at which a place comes next: going on, and going back. */
  get nextAhead(): number {
    return this.parts?.movement.nextAhead ?? Number.POSITIVE_INFINITY;
  }
  get nextBehind(): number {
    return this.parts?.movement.nextBehind ?? Number.NEGATIVE_INFINITY;
  }
  /** Extended board time at which a delay or an interval of a rule runs out next. */
  get nextTimerUs(): number {
    return this.parts?.run.nextTimerUs ?? Number.POSITIVE_INFINITY;
  }

  /** What a dashboard shows. Allocates: not for every frame. */
  view(): EngineView {
    return viewOf(this.program, this.parts?.run.s, this.parts?.ending);
  }
}

/** The engine's parts, made anew for a session, and the order in which an instant goes through them. */
class Parts {
  readonly course: Course;
  readonly movement: Movement;
  private readonly motion: Motion;
  private readonly licking: Licking;
  private readonly firing: Firing;
  private readonly arming: ArmingPass;
  readonly asking: Asking;
  readonly ending: Ending;
  private readonly turns: Turns;
  private readonly waterTallies: number[];
  private readonly pressed: number[] = [];

  constructor(readonly run: Run) {
    this.ending = new Ending(run);
    this.course = new Course(run, this.ending);
    this.movement = new Movement(run);
    this.motion = new Motion(run);
    this.licking = new Licking(run);
    this.firing = new Firing(run);
    this.arming = new ArmingPass(run, this.firing);
    this.asking = new Asking(run, this.firing, this.arming);
    this.turns = new Turns(run, this.firing, this.arming);
    this.waterTallies = run.s.program.tallies.flatMap((t, n) => (t.of === 'water' ? [n] : []));
  }

  /** Position, laps, licks and inputs first; then phase, draws, rules in order; `end` last. */
  instant(i: Instant, first: boolean): void {
    const { run, course } = this;
    const { s } = run;
    if (run.over) return;
    run.frame++;
    s.prevUs = s.nowUs;
    s.nowUs = i.nowUs;
    s.instant = i;
    const lapBegan = i.lapBegan || (first && i.placed && i.lap === 1 && !s.program.facts.seamMark);
    const corrected = s.placed && i.travelFrom !== s.travel;

    this.movement.step(i, lapBegan);
    this.motion.step(i);
    run.plasticity.step(i);
    if (i.lick) this.licking.lick();
    if ((i.rose | i.fell) !== 0) this.inputs(i);
    if (this.pressed.length > 0) this.takePresses();

    course.applyChoices(lapBegan);
    if (first) {
      course.begin(lapBegan);
      run.moments(s.program.sessionRules, s.nowUs, Number.NaN);
    } else course.step(lapBegan);
    course.draw(lapBegan, first, this.movement.visitDraws);
    if (run.valuesChanged) {
      run.valuesChanged = false;
      run.version++;
      this.movement.resolve();
      this.turns.resetTimers();
    }

    if (run.held.length > 0) this.endHolds();
    if (run.endReason === '') {
      this.asking.step();
      this.turns.take();
    }
    if (corrected) this.arming.disarmAll();
    this.arming.step();
    this.ending.step(lapBegan);
    if (run.endReason !== '') this.end();
  }

  private inputs(i: Instant): void {
    const { run } = this;
    const { program, nowUs } = run.s;
    for (const { input, rises, mark } of program.inputMarks) {
      if ((((rises ? i.rose : i.fell) >>> input) & 1) === 1) run.touch(mark);
    }
    for (const { input, rule } of program.risesRules) {
      if (((i.rose >>> input) & 1) === 1) run.moment(rule, nowUs, Number.NaN);
    }
    for (const { input, rule } of program.fallsRules) {
      if (((i.fell >>> input) & 1) === 1) run.moment(rule, nowUs, Number.NaN);
    }
  }

  press(button: string): void {
    const index = this.run.s.program.buttons.indexOf(button);
    if (index >= 0) this.pressed.push(index);
  }

  private takePresses(): void {
    const { run } = this;
    for (const button of this.pressed) {
      run.moments(run.s.program.buttonRules[button]!, run.s.nowUs, Number.NaN);
    }
    this.pressed.length = 0;
  }

  goTo(phase: string): void {
    const { run } = this;
    const index = run.s.program.phases.findIndex((spec) => spec.name === phase);
    if (index >= 0) run.requestPhase(index, 'the operator');
    else if (phase === 'next') run.requestPhase(NEXT, 'the operator');
    else if (phase === 'previous') run.requestPhase(PREVIOUS, 'the operator');
    else if (phase === 'repeat') run.requestPhase(REPEAT, 'the operator');
  }

  settle(rule: number, serial: number, how: Settlement): void {
    const r = this.run.s.rules[rule];
    if (r === undefined || this.arming.settle(r, serial, how)) return;
    const at = r.pending.findIndex((pending) => pending.serial === serial);
    if (at < 0) {
      // A delayed action is no firing of its own, but what it holds is over.
      if (how === 'not fired') this.firing.release(r, serial);
      return;
    }
    const pending = r.pending[at]!;
    r.pending.splice(at, 1);
    if (how === 'not fired') this.firing.withdraw(r, pending);
    else if (how === 'fired') this.run.journal.fired(rule, serial, false, false);
  }

  drop(volumeNl: number): void {
    const { s } = this.run;
    s.dropUs = s.nowUs;
    for (const index of this.waterTallies) s.tallies[index]!.add(volumeNl, s.nowUs);
  }

  outputIdle(output: number): void {
    const { held } = this.run;
    for (let n = held.length - 1; n >= 0; n--) if (held[n]!.output === output) held.splice(n, 1);
  }

  private endHolds(): void {
    const { run } = this;
    for (let n = run.held.length - 1; n >= 0; n--) {
      const hold = run.held[n]!;
      if (hold.during(run.s) === TRUE) continue;
      run.held.splice(n, 1);
      run.actuator.stop(hold.output);
    }
  }

  private tellEnd(inquiry: Inquiry): void {
    const { s } = this.run;
    let alternatives = 0;
    s.program.endAlternatives.forEach((test, n) => {
      if (test(s) === TRUE) alternatives |= 1 << n;
    });
    inquiry.ended(alternatives);
  }

  private end(): void {
    const { run } = this;
    run.over = true;
    this.arming.disarmAll();
    run.held.length = 0;
    run.delayed.length = 0;
    if (run.inquiry !== undefined) this.tellEnd(run.inquiry);
    run.actuator.endSession(run.endReason);
  }
}
