import { isOnStep } from '../steps.js';
import type { Draw } from './draw.js';
import type { Ending } from './ending.js';
import { NEXT, NOWHERE, PREVIOUS, REPEAT, type Run } from './run.js';
import { TRUE } from './truth.js';

/** The course of a session: cells, phases, draws and the operator's choices. */
export class Course {
  private cellAsked = false;
  private phaseOver = false;
  private phaseBegan = false;
  private cellBegan = false;
  private choiceQueued = false;

  constructor(
    private readonly run: Run,
    private readonly ending: Ending,
  ) {}

  /** The number of the present cell, one that was asked for counted in. */
  get cell(): number {
    return this.run.s.cellOrdinal + (this.cellAsked ? 1 : 0);
  }

  askCell(): void {
    this.cellAsked = true;
  }

  // ---- choices -------------------------------------------------------------------------------

  /** @returns false when there is no such choice or the value is not one of its own */
  choose(name: string, value: number | string): boolean {
    const { s } = this.run;
    const index = s.program.choices.findIndex((spec) => spec.name === name);
    const spec = s.program.choices[index];
    if (!spec) return false;
    const choice = s.choices[index]!;
    let option = -1;
    if (spec.between) {
      if (typeof value !== 'number') return false;
      const { from, to } = spec.between;
      if (!(value >= from(s) && value <= to(s))) return false;
      if (spec.step && !isOnStep(value, from(s), spec.step(s))) return false;
    } else {
      option = spec.options.findIndex((o) =>
        typeof value === 'string' ? o.word === value : o.word === '' && o.amount(s) === value,
      );
      if (option < 0) return false;
    }
    choice.queued = true;
    choice.queuedValue = typeof value === 'number' ? value : Number.NaN;
    choice.queuedOption = option;
    this.choiceQueued = true;
    return true;
  }

  /** Choices take effect: those that move a place as a lap begins, any other at once. */
  applyChoices(lapBegan: boolean): void {
    if (!this.choiceQueued) return;
    const { s } = this.run;
    this.choiceQueued = false;
    for (let n = 0; n < s.choices.length; n++) {
      const choice = s.choices[n]!;
      if (!choice.queued) continue;
      if (s.program.choices[n]!.movesPlace && !lapBegan) {
        this.choiceQueued = true;
        continue;
      }
      choice.queued = false;
      choice.value = choice.queuedValue;
      choice.option = choice.queuedOption;
      this.run.valuesChanged = true;
      const word = s.program.choices[n]!.options[choice.option]?.word ?? '';
      this.run.journal.chosen(n, word === '' ? choice.value : word);
    }
  }

  // ---- cells and phases ----------------------------------------------------------------------

  /** The session's first instant. */
  begin(lapBegan: boolean): void {
    this.beginCell(lapBegan, 'the session began');
  }

  /** Cells and phases that end or begin at this instant. */
  step(lapBegan: boolean): void {
    const { run } = this;
    const { s } = run;
    if (this.cellAsked) {
      this.beginCell(lapBegan, 'a new cell');
      return;
    }
    if (run.goTo !== NOWHERE) {
      this.follow(lapBegan);
      return;
    }
    if (s.phase < 0) return;
    const spec = s.program.phases[s.phase]!;
    if (spec.over === undefined) return;
    if (!this.phaseOver) {
      if (spec.over(s) !== TRUE) return;
      this.phaseOver = true;
    }
    if (spec.atLapEnd && !lapBegan) return;
    // The last phase ends the session, unless that was put off.
    const isLast = s.phase + 1 >= s.program.phases.length;
    if (isLast && !this.ending.isDue('the last phase ended')) return;
    this.beginPhase(s.phase + 1, lapBegan, spec.why);
  }

  private beginCell(lapBegan: boolean, reason: string): void {
    const { run } = this;
    const { s } = run;
    this.cellAsked = false;
    run.goTo = NOWHERE;
    s.cellOrdinal++;
    s.cellLapBase = s.lapOrdinal - (lapBegan ? 1 : 0);
    for (const tally of s.tallies) tally.cellBegan();
    this.cellBegan = true;
    run.journal.cellBegan(s.cellOrdinal);
    run.moments(s.program.cellRules, s.nowUs, Number.NaN);
    this.beginPhase(0, lapBegan, reason);
  }

  /** Does what `go to`, or the operator, asked for. */
  private follow(lapBegan: boolean): void {
    const { run } = this;
    const { goTo, goToReason } = run;
    const { phase } = run.s;
    run.goTo = NOWHERE;
    if (phase < 0) return;
    let to = goTo;
    if (goTo === NEXT) to = phase + 1;
    else if (goTo === PREVIOUS) to = phase > 0 ? phase - 1 : 0;
    else if (goTo === REPEAT) to = phase;
    this.beginPhase(to, lapBegan, goToReason);
  }

  private beginPhase(to: number, lapBegan: boolean, reason: string): void {
    const { run } = this;
    const { s } = run;
    const { phases } = s.program;
    if (to >= phases.length && phases.length > 0) {
      run.requestEnd('the last phase ended');
      return;
    }
    s.phase = phases.length > 0 ? to : -1;
    s.phaseOrdinal++;
    s.phaseUs = s.nowUs;
    s.phaseLapBase = s.lapOrdinal - (lapBegan ? 1 : 0);
    for (const tally of s.tallies) tally.phaseBegan();
    this.phaseOver = false;
    this.ending.phaseBegan();
    this.phaseBegan = true;
    run.valuesChanged = true;
    if (s.phase < 0) return;
    run.journal.phaseBegan(phases[s.phase]!.name, s.phaseOrdinal, reason);
    for (const { phase, mark } of s.program.phaseMarks) if (phase === s.phase) run.touch(mark);
    for (const { phase, rule } of s.program.phaseRules) {
      if (phase === s.phase) run.moment(rule, s.nowUs, Number.NaN);
    }
  }

  // ---- draws ---------------------------------------------------------------------------------

  /** Draws whose occasion this instant is, in the order of the file. */
  draw(lapBegan: boolean, first: boolean, visitDraws: number[]): void {
    const { run } = this;
    const any = lapBegan || first || this.phaseBegan || this.cellBegan;
    if (!any && !run.renewals && visitDraws.length === 0) return;
    const { s } = run;
    for (let n = 0; n < s.draws.length; n++) {
      const draw = s.draws[n]!;
      const { every } = draw.spec;
      // The present value of a draw to be renewed has been used; any other is drawn afresh.
      const freshBlock = this.phaseBegan && draw.newBlock(s, draw.renew);
      const due =
        draw.renew ||
        (every === 'lap' && lapBegan) ||
        (every === 'phase' && this.phaseBegan) ||
        (every === 'cell' && this.cellBegan) ||
        ((every === 'session' || every === 'firing') && first) ||
        (every === 'visit' && visitDraws.includes(n));
      if (due && !freshBlock) draw.next(s);
      draw.renew = false;
      if (due || freshBlock) this.tell(draw);
    }
    run.renewals = false;
    this.phaseBegan = false;
    this.cellBegan = false;
    visitDraws.length = 0;
  }

  private tell(draw: Draw): void {
    const { run } = this;
    const option = draw.spec.options[draw.option];
    const value = option && option.word !== '' ? option.word : draw.value;
    run.journal.drawn(draw.spec.name, draw.scope, draw.index, value);
    run.valuesChanged = true;
  }
}
