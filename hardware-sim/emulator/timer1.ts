import type { Chip, TimedPart } from './chip.js';
import type { Interrupt } from './interrupts.js';

const TCCR1B = 0x81;
const TCNT1L = 0x84;
const TCNT1H = 0x85;
const OCR1AL = 0x88;
const OCR1BL = 0x8a;
const TIFR1 = 0x36;
const TIMSK1 = 0x6f;
const FLAG = { overflow: 1, compareA: 2, compareB: 4 } as const;
/** TCCR1B, CS12:0: cycles of the chip to one of the timer; 0: stopped, or an outer clock. */
const PRESCALERS = [0, 1, 8, 64, 256, 1024, 0, 0];

interface Compare {
  value: number;
  due: number;
  readonly interrupt: Interrupt;
}

/**
 * Timer/Counter 1 in normal mode, without a step per tick: what it shows is worked out when it is
 * read, and flags have the cycle at which they will be set.
 *
 * Data sheet DS40002061, "16-bit Timer/Counter1 with PWM": "Accessing 16-bit Registers" (one
 * temporary register for the high byte), "Normal Mode", and the timing diagram "Setting of OCFnx,
 * with Prescaler (fclk_I/O/8)": the flag is set as the count leaves the compared value.
 */
export class Timer1 implements TimedPart {
  readonly #chip: Chip;
  readonly #a: Compare;
  readonly #b: Compare;
  readonly #overflow: Interrupt;
  #overflowDue = Number.POSITIVE_INFINITY;
  /** The cycle at which it was started after the last reset: the board's own time 0. */
  startedAt = 0;
  #prescaler = 0;
  /** The cycle at which the count was 0, were it not to wrap; a multiple of the prescaler. */
  #zeroAt = 0;
  #stoppedAt = 0;
  #temporary = 0;

  constructor(chip: Chip) {
    this.#chip = chip;
    const { timer1 } = chip.layout;
    const interrupt = (address: number, mask: number): Interrupt => ({
      address,
      flagRegister: TIFR1,
      flagMask: mask,
      enableRegister: TIMSK1,
      enableMask: mask,
    });
    const never = Number.POSITIVE_INFINITY;
    this.#a = { value: 0, due: never, interrupt: interrupt(timer1.compareA, FLAG.compareA) };
    this.#b = { value: 0, due: never, interrupt: interrupt(timer1.compareB, FLAG.compareB) };
    this.#overflow = interrupt(timer1.overflow, FLAG.overflow);
    const { cpu, interrupts } = chip;
    const { readHooks, writeHooks, data } = cpu;
    readHooks[TCNT1L] = () => {
      const count = this.count;
      this.#temporary = count >> 8;
      return count & 0xff;
    };
    readHooks[TCNT1H] = () => this.#temporary;
    writeHooks[TCNT1H] = (value) => {
      this.#temporary = value;
      return true;
    };
    writeHooks[TCNT1L] = (value) => {
      this.#setCount((this.#temporary << 8) | value);
      return true;
    };
    this.#hookCompare(OCR1AL, this.#a);
    this.#hookCompare(OCR1BL, this.#b);
    writeHooks[TCCR1B] = (value) => {
      const count = this.count;
      data[TCCR1B] = value;
      if (this.#prescaler === 0) this.startedAt = cpu.cycles;
      this.#prescaler = PRESCALERS[value & 7]!;
      this.#setCount(count);
      return true;
    };
    // "TIFR1": a flag is cleared by writing a one to it; the others stay.
    writeHooks[TIFR1] = (value) => {
      for (const one of [this.#a.interrupt, this.#b.interrupt, this.#overflow]) {
        if (value & one.flagMask) interrupts.clear(one);
      }
      return true;
    };
    writeHooks[TIMSK1] = (value) => {
      data[TIMSK1] = value;
      for (const one of [this.#a.interrupt, this.#b.interrupt, this.#overflow]) {
        interrupts.enabled(one);
      }
      return true;
    };
  }

  /** What TCNT1 shows now. */
  get count(): number {
    if (this.#prescaler === 0) return this.#stoppedAt;
    return Math.floor((this.#chip.cpu.cycles - this.#zeroAt) / this.#prescaler) & 0xffff;
  }

  get due(): number {
    return Math.min(this.#a.due, this.#b.due, this.#overflowDue);
  }

  act(): void {
    const { cpu, interrupts } = this.#chip;
    const { cycles } = cpu;
    const round = 0x1_0000 * this.#prescaler;
    for (const compare of [this.#a, this.#b]) {
      if (compare.due > cycles) continue;
      interrupts.flag(compare.interrupt);
      compare.due += round;
    }
    if (this.#overflowDue <= cycles) {
      interrupts.flag(this.#overflow);
      this.#overflowDue += round;
    }
  }

  reset(): void {
    this.#prescaler = 0;
    this.#stoppedAt = 0;
    this.#temporary = 0;
    this.#a.value = 0;
    this.#b.value = 0;
    this.#reckon();
  }

  #hookCompare(low: number, compare: Compare): void {
    const { readHooks, writeHooks } = this.#chip.cpu;
    writeHooks[low + 1] = (value) => {
      this.#temporary = value;
      return true;
    };
    writeHooks[low] = (value) => {
      compare.value = (this.#temporary << 8) | value;
      compare.due = this.#next(compare.value);
      this.#chip.reschedule();
      return true;
    };
    readHooks[low] = () => compare.value & 0xff;
    readHooks[low + 1] = () => compare.value >> 8;
  }

  #setCount(count: number): void {
    this.#stoppedAt = count;
    if (this.#prescaler > 0) {
      // The prescaler runs by itself and is not set back: ticks fall on its own beats.
      const beat = Math.floor(this.#chip.cpu.cycles / this.#prescaler) * this.#prescaler;
      this.#zeroAt = beat - count * this.#prescaler;
    }
    this.#reckon();
  }

  #reckon(): void {
    const running = this.#prescaler > 0;
    for (const compare of [this.#a, this.#b]) {
      compare.due = running ? this.#next(compare.value) : Number.POSITIVE_INFINITY;
    }
    this.#overflowDue = running ? this.#next(0xffff) : Number.POSITIVE_INFINITY;
    this.#chip.reschedule();
  }

  /** The cycle at which the count next leaves `value`. */
  #next(value: number): number {
    const prescaler = this.#prescaler;
    if (prescaler === 0) return Number.POSITIVE_INFINITY;
    const ticks = Math.floor((this.#chip.cpu.cycles - this.#zeroAt) / prescaler);
    const ahead = (value - ticks) & 0xffff;
    return this.#zeroAt + (ticks + ahead + 1) * prescaler;
  }
}
