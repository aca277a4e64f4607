import type { Chip, TimedPart } from './chip.js';
import type { Interrupt } from './interrupts.js';

const UCSRA = 0xc0;
const UCSRB = 0xc1;
const UCSRC = 0xc2;
const UBRRL = 0xc4;
const UBRRH = 0xc5;
const UDR = 0xc6;
const A = { rxc: 0x80, txc: 0x40, udre: 0x20, dor: 0x08, u2x: 0x02, mpcm: 0x01 } as const;
const B = { rxcie: 0x80, txcie: 0x40, udrie: 0x20, rxen: 0x10, txen: 0x08 } as const;
const NEVER = Number.POSITIVE_INFINITY;
/** Start, eight data bits, stop. */
const BITS = 10;

/**
 * USART 0, asynchronous, 8N1. Data sheet DS40002061, "USART0": "Data Transmission" (buffer and shift
 * register; UDRE interrupts for as long as it is set), "Receive Complete Flag and Interrupt",
 * "Receiver Error Flags" (a two-level receive buffer and the shift register; DOR when a further byte
 * comes), "UBRRn: examples" (baud = clock / (8 * (UBRR + 1)) with U2X).
 */
export class Usart implements TimedPart {
  /** A byte has left the chip: at the end of its stop bit. */
  sent: (byte: number) => void = () => {};
  /** Bytes lost because the program did not read in time. */
  lost = 0;
  readonly #chip: Chip;
  readonly #received: Interrupt;
  readonly #empty: Interrupt;
  readonly #complete: Interrupt;
  #line: number[] = [];
  #lineAt = 0;
  readonly #fifo = new Uint8Array(3);
  #held = 0;
  #receivedDue = NEVER;
  #sentDue = NEVER;
  #shift = 0;
  #buffer = -1;

  constructor(chip: Chip) {
    this.#chip = chip;
    const { cpu, interrupts, layout } = chip;
    const interrupt = (address: number, flagMask: number, enableMask: number) => ({
      address,
      flagRegister: UCSRA,
      flagMask,
      enableRegister: UCSRB,
      enableMask,
    });
    this.#received = { ...interrupt(layout.usart.received, A.rxc, B.rxcie), level: true };
    this.#empty = { ...interrupt(layout.usart.empty, A.udre, B.udrie), level: true };
    this.#complete = interrupt(layout.usart.sent, A.txc, B.txcie);
    const { data, readHooks, writeHooks } = cpu;
    writeHooks[UCSRA] = (value) => {
      const own = A.u2x | A.mpcm;
      data[UCSRA] = (data[UCSRA]! & ~own) | (value & own);
      if (value & A.txc) interrupts.clear(this.#complete);
      return true;
    };
    writeHooks[UCSRB] = (value) => {
      data[UCSRB] = value;
      for (const one of [this.#received, this.#empty, this.#complete]) {
        interrupts.enabled(one);
      }
      // "Disabling the Receiver": what was received and not read is lost.
      if ((value & B.rxen) === 0) this.#flush();
      this.#listen();
      return true;
    };
    writeHooks[UDR] = (value) => {
      if ((data[UCSRB]! & B.txen) === 0) return true;
      if (this.#sentDue === NEVER) {
        this.#send(value);
      } else {
        this.#buffer = value;
        interrupts.clear(this.#empty);
      }
      return true;
    };
    readHooks[UDR] = () => this.#read();
  }

  get due(): number {
    return Math.min(this.#receivedDue, this.#sentDue);
  }

  /** Cycles that one byte takes on the line. */
  get byteCycles(): number {
    const { data } = this.#chip.cpu;
    const divider = ((data[UBRRH]! & 0x0f) << 8) | data[UBRRL]!;
    return (divider + 1) * (data[UCSRA]! & A.u2x ? 8 : 16) * BITS;
  }

  /** Bytes from the other side, one behind the other from now on. */
  receive(bytes: Uint8Array): void {
    for (let i = 0; i < bytes.length; i++) this.#line.push(bytes[i]!);
    this.#listen();
  }

  /** Bytes that are still on their way to the chip. */
  get underway(): number {
    return this.#line.length - this.#lineAt;
  }

  act(): void {
    const { cpu, interrupts } = this.#chip;
    if (this.#sentDue <= cpu.cycles) {
      const byte = this.#shift;
      const at = this.#sentDue;
      this.#sentDue = NEVER;
      if (this.#buffer >= 0) {
        this.#send(this.#buffer, at);
        this.#buffer = -1;
        interrupts.flag(this.#empty);
      } else {
        interrupts.flag(this.#complete);
      }
      this.sent(byte);
    }
    if (this.#receivedDue <= cpu.cycles) {
      const at = this.#receivedDue;
      this.#receivedDue = NEVER;
      const byte = this.#line[this.#lineAt++]!;
      if (this.#held === this.#fifo.length) {
        this.lost++;
        cpu.data[UCSRA]! |= A.dor;
      } else {
        this.#fifo[this.#held++] = byte;
        interrupts.flag(this.#received);
      }
      this.#listen(at);
    }
  }

  reset(): void {
    const { data } = this.#chip.cpu;
    this.#line = [];
    this.#lineAt = 0;
    this.#held = 0;
    this.#buffer = -1;
    this.#receivedDue = NEVER;
    this.#sentDue = NEVER;
    data[UCSRA] = A.udre;
    data[UCSRC] = 6;
  }

  #read(): number {
    const { cpu, interrupts } = this.#chip;
    if (this.#held === 0) return 0;
    const byte = this.#fifo[0]!;
    this.#fifo.copyWithin(0, 1);
    this.#held--;
    cpu.data[UCSRA]! &= ~A.dor;
    if (this.#held === 0) interrupts.clear(this.#received);
    return byte;
  }

  #flush(): void {
    this.#held = 0;
    this.#chip.interrupts.clear(this.#received);
  }

  #send(byte: number, at = this.#chip.cpu.cycles): void {
    this.#shift = byte;
    this.#sentDue = at + this.byteCycles;
    this.#chip.reschedule();
  }

  #listen(at = this.#chip.cpu.cycles): void {
    if (this.#receivedDue !== NEVER) return;
    if (this.#lineAt === this.#line.length) {
      this.#line.length = 0;
      this.#lineAt = 0;
      return;
    }
    if ((this.#chip.cpu.data[UCSRB]! & B.rxen) === 0) return;
    this.#receivedDue = at + this.byteCycles;
    this.#chip.reschedule();
  }
}
