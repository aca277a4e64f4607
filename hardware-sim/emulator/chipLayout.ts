/**
 * Where two chips have what the firmware uses. Data-space addresses and vectors, from their data
 * sheets: ATmega48A/PA/88A/PA/168A/PA/328/P (DS40002061), "Register Summary" and "Interrupt Vectors
 * in ATmega328 and ATmega328P"; ATmega640/1280/1281/2560/2561 (DS40002211), the same chapters.
 */
export interface PortLayout {
  readonly pin: number;
  readonly ddr: number;
  readonly port: number;
}

export interface ChipLayout {
  readonly name: string;
  readonly flashWords: number;
  /** From 0x100 up, the extended I/O registers beyond that included. */
  readonly sramBytes: number;
  readonly ramStart: number;
  readonly ports: Readonly<Record<string, PortLayout>>;
  /** Pins of external interrupts, each with its bit in EIMSK and EIFR, and its vector. */
  readonly external: readonly { port: string; bit: number; flag: number; vector: number }[];
  readonly pinChange: { port: string; group: number; mask: number; vector: number };
  readonly timer1: { compareA: number; compareB: number; overflow: number };
  readonly usart: { received: number; empty: number; sent: number };
  readonly eepromReady: number;
}

/** Words of flash to the next interrupt vector. */
const vector = (number: number): number => (number - 1) * 2;
const port = (pin: number): PortLayout => ({ pin, ddr: pin + 1, port: pin + 2 });

export const ATMEGA328P: ChipLayout = {
  name: 'atmega328p',
  flashWords: 0x4000,
  sramBytes: 2048,
  ramStart: 0x100,
  ports: { B: port(0x23), C: port(0x26), D: port(0x29) },
  external: [
    { port: 'D', bit: 2, flag: 0, vector: vector(2) },
    { port: 'D', bit: 3, flag: 1, vector: vector(3) },
  ],
  pinChange: { port: 'B', group: 0, mask: 0x6b, vector: vector(4) },
  timer1: { compareA: vector(12), compareB: vector(13), overflow: vector(14) },
  usart: { received: vector(19), empty: vector(20), sent: vector(21) },
  eepromReady: vector(23),
};

export const ATMEGA2560: ChipLayout = {
  name: 'atmega2560',
  flashWords: 0x20000,
  sramBytes: 8192 + 0x100,
  ramStart: 0x200,
  ports: {
    A: port(0x20),
    E: port(0x2c),
    G: port(0x32),
    K: port(0x106),
  },
  external: [
    { port: 'E', bit: 4, flag: 4, vector: vector(6) },
    { port: 'E', bit: 5, flag: 5, vector: vector(7) },
  ],
  pinChange: { port: 'K', group: 2, mask: 0x6d, vector: vector(12) },
  timer1: { compareA: vector(18), compareB: vector(19), overflow: vector(21) },
  usart: { received: vector(26), empty: vector(27), sent: vector(28) },
  eepromReady: vector(31),
};
