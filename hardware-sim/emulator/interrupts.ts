import type { CPU } from 'avr8js';

/** One interrupt: where its flag and its enabling bit are, and its vector. */
export interface Interrupt {
  /** Word address; a lower one goes first ("Interrupt Vectors"). */
  readonly address: number;
  readonly flagRegister: number;
  readonly flagMask: number;
  readonly enableRegister: number;
  readonly enableMask: number;
  /** Asks for as long as its flag is set; the flag is not cleared by being served. */
  readonly level?: boolean;
}

/** Which interrupts are flagged and enabled. Flags are latched whether enabled or not. */
export class Interrupts {
  /** The vector of the first that asks; -1: none does. */
  next = -1;
  readonly #cpu: CPU;
  readonly #asking: (Interrupt | undefined)[] = new Array(128).fill(undefined);

  constructor(cpu: CPU) {
    this.#cpu = cpu;
  }

  flag(interrupt: Interrupt): void {
    const { data } = this.#cpu;
    data[interrupt.flagRegister]! |= interrupt.flagMask;
    if (data[interrupt.enableRegister]! & interrupt.enableMask) this.#ask(interrupt);
  }

  clear(interrupt: Interrupt): void {
    this.#cpu.data[interrupt.flagRegister]! &= ~interrupt.flagMask;
    this.#rest(interrupt.address);
  }

  /** Call after the register with this interrupt's enabling bit was written. */
  enabled(interrupt: Interrupt): void {
    const { data } = this.#cpu;
    const enabled = data[interrupt.enableRegister]! & interrupt.enableMask;
    if (enabled && data[interrupt.flagRegister]! & interrupt.flagMask) this.#ask(interrupt);
    else this.#rest(interrupt.address);
  }

  /** The first that asks is being served. */
  serve(): void {
    const interrupt = this.#asking[this.next]!;
    if (!interrupt.level) this.clear(interrupt);
  }

  reset(): void {
    this.#asking.fill(undefined);
    this.next = -1;
  }

  #ask(interrupt: Interrupt): void {
    this.#asking[interrupt.address] = interrupt;
    if (this.next < 0 || interrupt.address < this.next) this.next = interrupt.address;
  }

  #rest(address: number): void {
    if (this.#asking[address] === undefined) return;
    this.#asking[address] = undefined;
    if (this.next !== address) return;
    let next = address + 1;
    while (next < this.#asking.length && this.#asking[next] === undefined) next++;
    this.next = next < this.#asking.length ? next : -1;
  }
}
