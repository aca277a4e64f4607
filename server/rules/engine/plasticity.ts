import { FieldPredictor } from '../../plasticity/fieldPrediction.js';
import { AFTER_US, STEP_US } from '../../plasticity/kernel.js';
import { PositionTrail, WINDOW_STEPS } from '../../plasticity/positionTrail.js';
import type { Instant } from '../instant.js';
import type { Run } from './run.js';

/** An induction whose window is not over. */
interface Onset {
  readonly rule: number;
  readonly serial: number;
  readonly atUs: number;
  /** Belt moved since the session began, counts. */
  readonly moved: number;
  readonly placeCm: number;
}

/**
 * After each real firing of an inducing rule, the field that it is predicted to leave: reckoned once,
 * when the second after it has gone by. Costs one comparison a frame; nothing without such a rule.
 */
export class Plasticity {
  private readonly trail = new PositionTrail();
  private readonly predictor: FieldPredictor | undefined;
  private readonly window = new Float64Array(WINDOW_STEPS);
  private readonly onsets: Onset[] = [];
  /** Movement only: a correction of the position moves nothing. */
  private moved = 0;

  constructor(private readonly run: Run) {
    const { rules, facts } = run.s.program;
    if (rules.some(({ induces }) => induces)) {
      this.predictor = new FieldPredictor(facts.beltLengthCm);
    }
  }

  step(i: Instant): void {
    if (this.predictor === undefined) return;
    if (!i.placed) {
      this.trail.clear();
      this.onsets.length = 0;
      return;
    }
    const counts = i.travelTo - i.travelFrom;
    if (!Number.isNaN(counts)) this.moved += counts;
    this.trail.note(i.nowUs, this.moved);
    while (this.onsets.length > 0 && i.nowUs > this.onsets[0]!.atUs + AFTER_US + STEP_US) {
      this.predict(this.predictor, this.onsets.shift()!);
    }
  }

  /** A real firing of an inducing rule, at this instant. */
  induced(rule: number, serial: number): void {
    const { s } = this.run;
    if (!s.placed) return;
    const { nowUs: atUs } = s;
    this.onsets.push({ rule, serial, atUs, moved: this.moved, placeCm: s.instant.positionCm });
  }

  /** The board did none of it. */
  withdraw(rule: number, serial: number): void {
    const at = this.onsets.findIndex((onset) => onset.rule === rule && onset.serial === serial);
    if (at >= 0) this.onsets.splice(at, 1);
  }

  private predict(predictor: FieldPredictor, onset: Onset): void {
    const { run, window } = this;
    const { countsPerCm, rules } = run.s;
    this.trail.about(onset.atUs, window);
    for (let n = 0; n < WINDOW_STEPS; n++) window[n] = (window[n]! - onset.moved) / countsPerCm;
    const field = predictor.predict(window, onset.placeCm);
    if (field === undefined) return;
    rules[onset.rule]!.field = field;
    rules[onset.rule]!.fieldCell = run.s.cellOrdinal;
    run.journal.fieldPredicted(onset.rule, onset.serial, field, shareOfPeak(predictor.curve));
  }
}

/** The curve over the belt in even bins, in thousandths of its peak. */
function shareOfPeak(curve: Float64Array): number[] {
  let top = 0;
  for (const value of curve) if (value > top) top = value;
  return Array.from(curve, (value) => Math.floor((value / top) * 1000 + 0.5) / 1000);
}
