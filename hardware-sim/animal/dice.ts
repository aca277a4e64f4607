/** Seeded chance for the simulation: Xorshift with the draws that animal and belt need. */
import { Xorshift32 } from '../board/xorshift.js';

export class Dice {
  readonly #source: Xorshift32;

  constructor(seed: number) {
    // Small seeds give small first numbers: let them mix.
    this.#source = new Xorshift32(Math.imul(seed, 0x9e37_79b1) ^ 0x5bd1_e995);
    for (let i = 0; i < 8; i++) this.#source.next();
  }

  /** [0, 1). */
  unit(): number {
    return this.#source.next() / 0x1_0000_0000;
  }

  between(least: number, most: number): number {
    return least + (most - least) * this.unit();
  }

  chance(probability: number): boolean {
    return this.unit() < probability;
  }

  /** Exponential, the given mean. */
  wait(mean: number): number {
    return -Math.log(1 - this.unit()) * mean;
  }

  /** About normal, mean 0 and deviation 1 (four uniform draws). */
  normal(): number {
    return (this.unit() + this.unit() + this.unit() + this.unit() - 2) * 1.732_050_8;
  }
}
