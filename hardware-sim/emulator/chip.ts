/**
 * A chip that runs a .hex file: avr8js's instructions, with a step loop and peripherals of our own,
 * since those that come with it lose bytes and interrupts. Time is the chip's own cycles, 16 a
 * microsecond; nothing here reads a clock.
 *
 * Not modelled: the pin synchroniser (up to 1.5 cycles from a pin to the program), brown-out, and
 * every peripheral that the firmware does not use.
 */
import { avrInstruction, avrInterrupt, CPU } from 'avr8js';
import type { ChipLayout } from './chipLayout.js';
import { Eeprom } from './eeprom.js';
import { Interrupts } from './interrupts.js';
import { Pins } from './pins.js';
import { Timer1 } from './timer1.js';
import { Usart } from './usart.js';
import { Watchdog } from './watchdog.js';

export const CYCLES_PER_US = 16;

const SREG = 0x5f;
const SMCR = 0x53;
const MCUSR = 0x54;
const I_FLAG = 0x80;
const SLEEP_ENABLE = 1;
const OPCODE = { sleep: 0x9588, sei: 0x9478, reti: 0x9518 } as const;

/** Bits of MCUSR. */
export const RESET_FLAG = { powerOn: 1, external: 2, brownOut: 4, watchdog: 8 } as const;

/** Something that wants to act at a cycle of its own: `due` is Infinity while it does not. */
export interface TimedPart {
  readonly due: number;
  act(): void;
}

export class Chip {
  readonly cpu: CPU;
  readonly layout: ChipLayout;
  readonly interrupts: Interrupts;
  readonly pins: Pins;
  readonly timer1: Timer1;
  readonly usart: Usart;
  readonly watchdog: Watchdog;
  readonly eeprom: Eeprom;
  /** Cycles with interrupts off at one stretch, the longest since this was last set to 0. */
  longestOffCycles = 0;
  /** The lowest that the stack pointer has been. */
  lowestStack = 0xffff;
  sleeping = false;
  /** Called when the watchdog has reset the chip. */
  resetItself: () => void = () => {};
  readonly #parts: readonly TimedPart[];
  #offSince = 0;
  #due = 0;
  #resetWanted = false;

  constructor(program: Uint16Array, layout: ChipLayout, eeprom?: Uint8Array) {
    this.layout = layout;
    this.cpu = new CPU(program, layout.sramBytes);
    this.interrupts = new Interrupts(this.cpu);
    this.timer1 = new Timer1(this);
    this.usart = new Usart(this);
    this.pins = new Pins(this);
    this.watchdog = new Watchdog(this, () => {
      this.#resetWanted = true;
    });
    this.eeprom = new Eeprom(this, eeprom);
    this.#parts = [this.timer1, this.usart, this.watchdog];
    this.reset(RESET_FLAG.powerOn);
  }

  /** Says that some part's `due` has changed. */
  reschedule(): void {
    let due = Number.POSITIVE_INFINITY;
    for (const part of this.#parts) if (part.due < due) due = part.due;
    this.#due = due;
  }

  /** The chip begins anew; memory keeps what it held, as it does on a chip that stays powered. */
  reset(flag: number): void {
    const { cpu, layout } = this;
    const flags = cpu.data[MCUSR]!;
    cpu.reset();
    this.interrupts.reset();
    cpu.data.fill(0, 0, layout.ramStart);
    cpu.data[MCUSR] = flags | flag;
    cpu.SP = cpu.data.length - 1;
    this.sleeping = false;
    this.#resetWanted = false;
    this.#offSince = cpu.cycles;
    this.pins.reset();
    this.timer1.reset();
    this.usart.reset();
    this.watchdog.reset(flag === RESET_FLAG.watchdog);
    this.eeprom.reset();
    this.reschedule();
  }

  /** Runs until the cycle counter is at `until` or the end of the instruction that reaches it. */
  run(until: number): void {
    const { cpu, interrupts } = this;
    const { progMem, data } = cpu;
    while (cpu.cycles < until) {
      let opcode = 0;
      if (this.sleeping) {
        if (interrupts.next >= 0) {
          // "Interrupt Response Time": four cycles more out of a sleep mode.
          this.sleeping = false;
          cpu.cycles += 4;
        } else {
          const next = Math.min(this.#due, until);
          if (next > cpu.cycles) cpu.cycles = next;
        }
      } else {
        opcode = progMem[cpu.pc]!;
        avrInstruction(cpu);
        if (opcode === OPCODE.sleep && (data[SMCR]! & SLEEP_ENABLE) !== 0) this.sleeping = true;
      }
      if (cpu.cycles >= this.#due) this.#act();
      if ((data[SREG]! & I_FLAG) === 0) {
        if (this.#offSince < 0) this.#offSince = cpu.cycles;
        continue;
      }
      if (this.#offSince >= 0) {
        const off = cpu.cycles - this.#offSince;
        if (off > this.longestOffCycles) this.longestOffCycles = off;
        this.#offSince = -1;
      }
      // "Reset and Interrupt Handling": after SEI and RETI one more instruction is executed first.
      if (interrupts.next < 0 || opcode === OPCODE.reti || opcode === OPCODE.sei) continue;
      if (!this.sleeping) this.#interrupt();
    }
  }

  #interrupt(): void {
    const { cpu, interrupts } = this;
    this.#offSince = cpu.cycles;
    avrInterrupt(cpu, interrupts.next);
    // "Interrupt Response Time": four cycles at least (five where the program counter has 22 bits);
    // avr8js counts two.
    cpu.cycles += cpu.pc22Bits ? 3 : 2;
    interrupts.serve();
    if (cpu.SP < this.lowestStack) this.lowestStack = cpu.SP;
  }

  #act(): void {
    for (const part of this.#parts) while (part.due <= this.cpu.cycles) part.act();
    this.reschedule();
    if (!this.#resetWanted) return;
    this.reset(RESET_FLAG.watchdog);
    this.resetItself();
  }
}
