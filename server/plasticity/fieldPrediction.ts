import { EDGE_SHARE, gaussianSteps, INPUT_TUNING_CM, kernelSteps } from './kernel.js';
import { WINDOW_STEPS } from './positionTrail.js';

/**
 * The place field that one induction is predicted to leave. A prediction from the run, not a
 * measurement of a cell.
 */
export interface FieldPrediction {
  /** Where the animal was at the onset. */
  readonly onsetCm: number;
  /** Where the field is highest, and the centre of mass of what lies between its edges. */
  readonly peakCm: number;
  readonly centreCm: number;
  /** Between the places where it falls to a fifth of its peak; the whole belt if it never does. */
  readonly widthCm: number;
  /** (Part before the peak - part after it) / width: above 0 when it reaches further back. */
  readonly asymmetry: number;
  /** How far the peak lies before the onset, against the direction of running. */
  readonly shiftCm: number;
}

/** Predicts fields on one belt: buffers made once, so that a prediction allocates only its result. */
export class FieldPredictor {
  /** Weight by place, in even bins of about 1 cm. */
  readonly curve: Float64Array;
  readonly binCm: number;
  private readonly occupied: Float64Array;
  private readonly kernel = kernelSteps();
  private readonly tuning: Float64Array;

  constructor(
    private readonly beltLengthCm: number,
    tuningCm = INPUT_TUNING_CM,
  ) {
    const bins = Math.max(8, Math.floor(beltLengthCm + 0.5));
    this.binCm = beltLengthCm / bins;
    this.curve = new Float64Array(bins);
    this.occupied = new Float64Array(bins);
    // Two passes of one tuning are one pass of a tuning wider by the root of two.
    this.tuning = gaussianSteps(tuningCm * Math.sqrt(2), this.binCm);
  }

  /**
   * @param movedCm belt moved since the onset, cm, at the middle of each step of the window; NaN
   *   where it is not known, which counts for nothing
   * @param onsetCm where the animal was at the onset
   * @returns undefined when less than half of the window is known
   */
  predict(movedCm: Float64Array, onsetCm: number): FieldPrediction | undefined {
    if (!this.occupy(movedCm, onsetCm)) return undefined;
    this.spread();
    return this.measure(onsetCm);
  }

  /** Belt occupied, weighted by the plasticity window; each step shared between two bins. */
  private occupy(movedCm: Float64Array, onsetCm: number): boolean {
    const { occupied, binCm } = this;
    const bins = occupied.length;
    occupied.fill(0);
    let known = 0;
    for (let n = 0; n < WINDOW_STEPS; n++) {
      const moved = movedCm[n]!;
      if (Number.isNaN(moved)) continue;
      known++;
      const at = (onsetCm + moved) / binCm;
      const low = Math.floor(at);
      const share = at - low;
      const bin = wrap(low, bins);
      occupied[bin]! += this.kernel[n]! * (1 - share);
      occupied[wrap(bin + 1, bins)]! += this.kernel[n]! * share;
    }
    return known * 2 >= WINDOW_STEPS;
  }

  /** Circular convolution with the inputs' tuning. */
  private spread(): void {
    const { curve, occupied, tuning } = this;
    const bins = curve.length;
    for (let to = 0; to < bins; to++) {
      let sum = tuning[0]! * occupied[to]!;
      for (let n = 1; n < tuning.length; n++) {
        sum += tuning[n]! * (occupied[wrap(to - n, bins)]! + occupied[wrap(to + n, bins)]!);
      }
      curve[to] = sum;
    }
  }

  private measure(onsetCm: number): FieldPrediction {
    const { curve, binCm, beltLengthCm } = this;
    const bins = curve.length;
    let top = 0;
    for (let n = 1; n < bins; n++) if (curve[n]! > curve[top]!) top = n;
    const left = curve[wrap(top - 1, bins)]!;
    const right = curve[wrap(top + 1, bins)]!;
    const bend = left - 2 * curve[top]! + right;
    // The vertex of the parabola through the three highest bins.
    const peakBin = top + (bend === 0 ? 0 : (left - right) / (2 * bend));
    const edge = curve[top]! * EDGE_SHARE;
    const back = this.edgeFrom(top, -1, edge);
    const ahead = this.edgeFrom(top, 1, edge);
    const whole = back + ahead >= bins;
    const peakCm = wrap(peakBin * binCm, beltLengthCm);
    const behindCm = (back + (peakBin - top)) * binCm;
    const widthCm = whole ? beltLengthCm : (back + ahead) * binCm;
    const asymmetry = whole ? 0 : (behindCm - (widthCm - behindCm)) / widthCm;
    const centreCm = wrap((top + this.centreFrom(top, back, ahead)) * binCm, beltLengthCm);
    const shiftCm = nearer(onsetCm - peakCm, beltLengthCm);
    return { onsetCm, peakCm, centreCm, widthCm, asymmetry, shiftCm };
  }

  /** Bins from the top to where the curve first falls to `edge`, going one way. */
  private edgeFrom(top: number, by: number, edge: number): number {
    const { curve } = this;
    const bins = curve.length;
    let before = curve[top]!;
    for (let n = 1; n < bins; n++) {
      const value = curve[wrap(top + n * by, bins)]!;
      if (value <= edge) return n - 1 + (before - edge) / (before - value);
      before = value;
    }
    return bins;
  }

  /** Centre of mass between the edges, in bins from the top; on the whole belt half of it each way. */
  private centreFrom(top: number, back: number, ahead: number): number {
    const { curve } = this;
    const bins = curve.length;
    const half = Math.floor(bins / 2);
    let mass = 0;
    let moment = 0;
    for (let n = -Math.min(Math.floor(back), half); n <= Math.min(Math.floor(ahead), half); n++) {
      const value = curve[wrap(top + n, bins)]!;
      mass += value;
      moment += n * value;
    }
    return moment / mass;
  }
}

function wrap(value: number, length: number): number {
  return value - Math.floor(value / length) * length;
}

/** A difference along the belt, the shorter way round. */
function nearer(difference: number, length: number): number {
  return wrap(difference + length / 2, length) - length / 2;
}
