import { uniform } from './hash.js';
import type { DrawSpec } from './program.js';
import { shuffledBlock } from './shuffledBlock.js';
import type { State } from './state.js';

/** A value that was drawn: which one, and for a choice among options, the option. */
export interface Drawn {
  readonly index: number;
  readonly value: number;
  readonly option: number;
}

/** One line of the `draws` section as it stands. */
export class Draw {
  /** NaN and -1 until first drawn. */
  value = Number.NaN;
  option = -1;
  index = -1;
  /** A firing that it names was made: it is renewed at the next instant. */
  renew = false;
  private nextIndex = 0;
  private block = 0;
  private blockOptions: number[] = [];
  /** The run of equal options that ended with the value before the present one. */
  private runOption = -1;
  private runLength = 0;
  private readonly returned: Drawn[] = [];

  constructor(
    readonly spec: DrawSpec,
    private readonly seed: string,
    private readonly beltLengthCm: number,
  ) {}

  /** What the present value is for, in the record. */
  get scope(): string {
    return this.spec.blockSize > 0 ? `block ${this.block}` : `every ${this.spec.every}`;
  }

  /**
   * A new phase starts a new block. A value that is for a firing to come is drawn again from it.
   * @param used the present value has been used, and will be renewed anyway
   * @returns true when a value was drawn
   */
  newBlock(s: State, used: boolean): boolean {
    if (this.spec.blockSize === 0) return false;
    this.blockOptions.length = 0;
    this.returned.length = 0;
    if (this.spec.every !== 'firing' || this.index < 0 || used) return false;
    // The value before stays the last one used: the one replaced never happened.
    this.draw(s, false);
    return true;
  }

  /** Draws the next value; the present one has been used. */
  next(s: State): void {
    const back = this.returned.shift();
    if (back) {
      this.noteUsed();
      this.set(back);
    } else this.draw(s, true);
  }

  /** Puts the present value back for later and takes up one that was not used after all. */
  takeBack(used: Drawn): void {
    if (this.index === used.index) return;
    this.returned.push({ index: this.index, value: this.value, option: this.option });
    this.returned.sort((a, b) => a.index - b.index);
    this.set(used);
  }

  /** What the value would be worth now: an option may be a place that has moved. */
  amount(s: State): number {
    const option = this.spec.options[this.option];
    return option === undefined || option.word === '' ? this.value : option.amount(s);
  }

  private set(drawn: Drawn): void {
    this.index = drawn.index;
    this.value = drawn.value;
    this.option = drawn.option;
  }

  private noteUsed(): void {
    if (this.index < 0 || this.spec.options.length === 0) return;
    if (this.option === this.runOption) this.runLength++;
    else {
      this.runOption = this.option;
      this.runLength = 1;
    }
  }

  private draw(s: State, used: boolean): void {
    const last = used ? this.value : Number.NaN;
    if (used) this.noteUsed();
    const index = this.nextIndex++;
    if (this.spec.between) {
      this.set({ index, value: this.drawBetween(s, index, last), option: -1 });
      return;
    }
    const option = this.spec.blockSize > 0 ? this.drawFromBlock() : this.drawOption(s, index, last);
    this.set({ index, value: this.spec.options[option]!.amount(s), option });
  }

  private drawFromBlock(): number {
    if (this.blockOptions.length === 0) {
      this.block++;
      this.blockOptions = shuffledBlock(
        this.spec,
        (index, attempt) =>
          uniform(this.seed, this.spec.name, `block ${this.block}`, index, attempt),
        this.runOption,
        this.runLength,
      );
    }
    return this.blockOptions.shift()!;
  }

  /** One of the options by weight, those left out that a habit forbids now. */
  private drawOption(s: State, index: number, last: number): number {
    const { options, weights, mostInARow } = this.spec;
    const least = this.spec.apart ? this.spec.apart(s) : 0;
    const allowed = options.map((option, n) => {
      if (mostInARow > 0 && n === this.runOption && this.runLength >= mostInARow) return false;
      return !(least > 0) || Number.isNaN(last) || this.distance(option.amount(s), last) >= least;
    });
    let total = 0;
    for (let n = 0; n < options.length; n++) if (allowed[n]) total += weights[n]!;
    let left = uniform(this.seed, this.spec.name, this.scope, index, 0) * total;
    let chosen = -1;
    for (let n = 0; n < options.length; n++) {
      if (!allowed[n]) continue;
      chosen = n;
      left -= weights[n]!;
      if (left < 0) break;
    }
    // Nothing is allowed only where the checker has already said so; then habits give way.
    if (chosen < 0)
      return Math.floor(uniform(this.seed, this.spec.name, this.scope, index, 1) * options.length);
    return chosen;
  }

  /**
   * A point of the lattice between the bounds, each of those far enough from the last equally
   * likely. On the belt, far enough both ways round.
   */
  private drawBetween(s: State, index: number, last: number): number {
    const { from, to, numerator, denominator } = this.spec.between!;
    const low = from(s);
    const step = numerator(s);
    const count = Math.floor(((to(s) - low) * denominator) / step + 1e-9);
    const least = this.spec.apart ? this.spec.apart(s) : 0;
    const share = uniform(this.seed, this.spec.name, this.scope, index, 0);
    const at = (k: number): number => low + (k * step) / denominator;
    if (!(least > 0) || Number.isNaN(last)) return at(Math.floor(share * (count + 1)));

    const round = this.spec.dimension === 'length' ? this.beltLengthCm : Number.POSITIVE_INFINITY;
    const toStep = (value: number): number => ((value - low) * denominator) / step;
    const clampLow = (value: number): number => Math.max(0, Math.ceil(toStep(value) - 1e-9));
    const clampHigh = (value: number): number => Math.min(count, Math.floor(toStep(value) + 1e-9));
    const belowFrom = round < Number.POSITIVE_INFINITY ? clampLow(last - round + least) : 0;
    const below = clampHigh(last - least) - belowFrom + 1;
    const aboveFrom = clampLow(last + least);
    const aboveTo = round < Number.POSITIVE_INFINITY ? clampHigh(last + round - least) : count;
    const above = aboveTo - aboveFrom + 1;
    const belowCount = Math.max(below, 0);
    const aboveCount = Math.max(above, 0);
    if (belowCount + aboveCount === 0) return at(Math.floor(share * (count + 1)));
    const k = Math.floor(share * (belowCount + aboveCount));
    return at(k < belowCount ? belowFrom + k : aboveFrom + k - belowCount);
  }

  private distance(a: number, b: number): number {
    const apart = a < b ? b - a : a - b;
    if (this.spec.dimension !== 'length') return apart;
    return Math.min(apart, this.beltLengthCm - apart);
  }
}
