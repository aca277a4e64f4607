import { Dice } from './dice.js';
import { LickSensor } from './lickSensor.js';
import type { AnimalParameters } from './parameters.js';

/** How often the animal makes up its mind, microseconds. */
const THINK_US = 10_000;
/** One stride: how long a speed within a bout lasts, s. */
const STRIDE_S = 0.5;
const BURST_S = 1;
/** More water than this does not hang at a spout, uL: it falls. */
const HANGS_MOST_UL = 15;

type Mode = 'run' | 'pause' | 'back' | 'drink' | 'groom';

/**
 * A head-fixed animal on a belt: runs in bouts, pauses, sometimes steps back or grooms, licks, and
 * learns where water comes. It sees only what an animal would: where it is, and drops at its mouth.
 */
export class Animal {
  speedCmPerS = 0;
  /** 0: naive; 1: certain where the water comes. */
  skill: number;
  /** Where it expects water, cm along the belt; NaN while it has no idea. */
  expectedCm: number;
  drunkUl = 0;
  readonly licking: LickSensor;
  readonly #parameters: AnimalParameters;
  readonly #lengthCm: number;
  readonly #dice: Dice;
  #mode: Mode = 'pause';
  #wantsCmPerS = 0;
  #cruiseCmPerS = 20;
  #strideFactor = 1;
  #strideEndsUs = 0;
  #modeEndsUs = 300_000;
  #thinkUs = 0;
  readonly #thinkEveryUs: number;
  readonly #follow: number;
  #atSpoutUl = 0;
  /** It has begun to lick in expectation on this approach. */
  #anticipated = false;
  #anticipateCm = 0;

  constructor(
    parameters: AnimalParameters,
    lengthCm: number,
    seed: number,
    trained: boolean,
    expectedCm: number,
    strideUs = 1_000,
  ) {
    this.#parameters = parameters;
    this.#lengthCm = lengthCm;
    this.#dice = new Dice(seed);
    this.licking = new LickSensor(parameters, seed + 1);
    this.skill = trained ? parameters.trainedSkill : 0;
    this.expectedCm = trained ? expectedCm : Number.NaN;
    this.#thinkEveryUs = Math.max(THINK_US, strideUs);
    this.#follow = 1 - Math.exp(-strideUs / 1e6 / parameters.responseS);
  }

  /** 1 at the start of a session, 0 when it has had its fill. */
  get thirst(): number {
    return Math.max(0, 1 - this.drunkUl / this.#parameters.quenchedUl);
  }

  /** Water at the spout, not yet licked up. */
  get atSpoutUl(): number {
    return this.#atSpoutUl;
  }

  /** One stride of the simulation's clock: the speed from `nowUs` on, cm/s, negative backwards. */
  step(nowUs: number, positionCm: number): number {
    if (nowUs >= this.#thinkUs) {
      this.#thinkUs = nowUs + this.#thinkEveryUs;
      this.#think(nowUs, positionCm);
    }
    const wants = this.#wantsCmPerS;
    let speed = this.speedCmPerS + (wants - this.speedCmPerS) * this.#follow;
    if (wants === 0 && speed < 0.1 && speed > -0.1) speed = 0;
    this.speedCmPerS = speed;
    return speed;
  }

  /** A drop appears at the spout while the animal is at `positionCm`. */
  drop(ul: number, positionCm: number, nowUs: number): void {
    this.#atSpoutUl = Math.min(HANGS_MOST_UL, this.#atSpoutUl + ul);
    const { naiveMissChance, trainedMissChance } = this.#parameters;
    const misses = trainedMissChance + (naiveMissChance - trainedMissChance) * (1 - this.skill);
    // What it did not notice hangs there until it licks for another reason, and teaches nothing.
    if (this.#dice.chance(misses)) return;
    this.#learn(positionCm);
    // It feels the drop: a naive animal does not always stop for it.
    if (this.#dice.chance(0.4 + 0.6 * this.skill)) {
      this.#mode = 'drink';
      this.#wantsCmPerS = 0;
      this.#modeEndsUs =
        nowUs + Math.round(this.#parameters.drinkS * 1e6 * this.#dice.between(0.7, 1.4));
    }
    const licks = Math.round(this.#parameters.drinkLicks * this.#dice.between(0.6, 1.4));
    this.licking.begin(nowUs + Math.round(this.#dice.between(60_000, 180_000)), licks);
  }

  /** The tongue has touched the spout. */
  licked(): void {
    const sip = Math.min(this.#atSpoutUl, this.#parameters.sipUl);
    this.#atSpoutUl -= sip;
    this.drunkUl += sip;
  }

  #learn(positionCm: number): void {
    const { learningPerDrop, samePlaceCm } = this.#parameters;
    if (Number.isNaN(this.expectedCm)) this.expectedCm = positionCm;
    const half = this.#lengthCm / 2;
    const off = this.#wrap(positionCm - this.expectedCm + half) - half;
    if (Math.abs(off) <= samePlaceCm) {
      this.expectedCm = this.#wrap(this.expectedCm + off * 0.2);
      this.skill += (1 - this.skill) * learningPerDrop;
    } else {
      this.skill *= 1 - learningPerDrop * 2;
      if (this.skill < 0.3) this.expectedCm = positionCm;
    }
  }

  #think(nowUs: number, positionCm: number): void {
    if (nowUs >= this.#modeEndsUs) this.#change(nowUs);
    if (this.#mode === 'run') this.#run(nowUs, positionCm);
  }

  #change(nowUs: number): void {
    const p = this.#parameters;
    const dice = this.#dice;
    let seconds: number;
    if (this.#mode === 'run' && this.thirst > 0) {
      seconds = dice.wait(p.pauseS) / Math.max(0.1, this.thirst);
      if (dice.chance(p.groomChance)) {
        this.#mode = 'groom';
        const groomMs = dice.between(p.groomLeastMs, p.groomMostMs);
        seconds = groomMs / 1000 + 0.6;
        this.licking.groom(nowUs + 400_000, Math.round(groomMs * 1000));
      } else {
        this.#mode = 'pause';
      }
      this.#wantsCmPerS = 0;
    } else if (this.#mode === 'pause' && dice.chance(p.backChance)) {
      this.#mode = 'back';
      this.#wantsCmPerS = -p.backCmPerS;
      seconds = dice.between(0.3, p.backMostCm) / p.backCmPerS;
    } else if (this.thirst <= p.idleBelowThirst) {
      this.#mode = 'pause';
      this.#wantsCmPerS = 0;
      seconds = dice.wait(20);
    } else {
      this.#mode = 'run';
      this.#cruiseCmPerS = dice.between(p.slowestCruiseCmPerS, p.fastestCruiseCmPerS);
      this.#strideEndsUs = 0;
      seconds = 1 + dice.wait(p.boutS - 1) * Math.max(0.2, this.thirst);
    }
    this.#modeEndsUs = nowUs + Math.round(seconds * 1e6);
  }

  #run(nowUs: number, positionCm: number): void {
    const p = this.#parameters;
    const dice = this.#dice;
    if (nowUs >= this.#strideEndsUs) {
      const burst = dice.chance(p.burstChance);
      this.#strideFactor = burst
        ? (p.burstCmPerS * dice.between(0.75, 1)) / this.#cruiseCmPerS
        : 1 + p.strideSpread * (2 * dice.unit() - 1);
      this.#strideEndsUs = nowUs + Math.round((burst ? BURST_S : STRIDE_S) * 1e6);
    }
    let wants = this.#cruiseCmPerS * this.#strideFactor;
    const eager = this.skill * Math.min(1, this.thirst * 3);
    if (eager > 0) {
      const aheadCm = this.#wrap(this.expectedCm - positionCm);
      if (aheadCm < p.slowingCm) {
        const slow =
          p.spoutCmPerS +
          (Math.max(wants, p.spoutCmPerS) - p.spoutCmPerS) * (aheadCm / p.slowingCm);
        wants += (slow - wants) * eager;
        this.#anticipate(nowUs, aheadCm, eager);
      } else {
        this.#anticipated = false;
        this.#anticipateCm = p.anticipationCm * dice.between(0.6, 1.4);
      }
    }
    const boutsPerS = p.naiveBoutsPerS * (1 - this.skill) ** 2 + p.trainedBoutsPerS;
    if (dice.chance((boutsPerS * this.thirst * this.#thinkEveryUs) / 1e6)) {
      this.licking.begin(nowUs, 1 + Math.round(dice.wait(p.dryLicks - 1)));
    }
    this.#wantsCmPerS = wants;
  }

  #anticipate(nowUs: number, aheadCm: number, eager: number): void {
    if (this.#anticipated || aheadCm > this.#anticipateCm) return;
    this.#anticipated = true;
    if (!this.#dice.chance(eager)) return;
    this.licking.begin(nowUs, this.#parameters.dryLicks + 4);
  }

  #wrap(cm: number): number {
    return cm - Math.floor(cm / this.#lengthCm) * this.#lengthCm;
  }
}
