import type { Chip } from './chip.js';
import type { Interrupt } from './interrupts.js';

const EECR = 0x3f;
const EEDR = 0x40;
const EEARL = 0x41;
const EEARH = 0x42;
const BIT = { eerie: 8, eempe: 4, eepe: 2, eere: 1 } as const;
/** A bit that the chip does not have, which stands for "ready". */
const READY = 0x80;
/** "EEPROM programming time": 3.4 ms for erase and write. */
const WRITE_CYCLES = 3_400 * 16;

/**
 * The EEPROM. Data sheet DS40002061, "EEPROM Data Memory" and "EECR": a write begins within four
 * cycles of EEMPE and keeps EEPE set until it is done; a read halts the CPU for four cycles.
 */
export class Eeprom {
  /** What it holds; erased where nothing was written. */
  readonly bytes: Uint8Array;
  #busyUntil = 0;
  #mayWriteUntil = -1;
  readonly #chip: Chip;

  constructor(chip: Chip, bytes: Uint8Array = new Uint8Array(1024).fill(0xff)) {
    this.bytes = bytes;
    this.#chip = chip;
    const ready: Interrupt = {
      address: chip.layout.eepromReady,
      flagRegister: EECR,
      flagMask: READY,
      enableRegister: EECR,
      enableMask: BIT.eerie,
      level: true,
    };
    const { cpu } = chip;
    const { data, readHooks, writeHooks } = cpu;
    const address = () => ((data[EEARH]! << 8) | data[EEARL]!) % this.bytes.length;
    readHooks[EECR] = () =>
      (data[EECR]! & BIT.eerie) | (cpu.cycles < this.#busyUntil ? BIT.eepe : 0);
    writeHooks[EECR] = (value) => {
      data[EECR] = READY | (value & BIT.eerie);
      chip.interrupts.enabled(ready);
      if (value & BIT.eere) {
        data[EEDR] = this.bytes[address()]!;
        cpu.cycles += 4;
      }
      if (value & BIT.eepe && cpu.cycles <= this.#mayWriteUntil) {
        this.bytes[address()] = data[EEDR]!;
        this.#busyUntil = cpu.cycles + WRITE_CYCLES;
        cpu.cycles += 2;
      }
      if (value & BIT.eempe) this.#mayWriteUntil = cpu.cycles + 5;
      return true;
    };
  }

  reset(): void {
    this.#chip.cpu.data[EECR] = READY;
    this.#busyUntil = 0;
    this.#mayWriteUntil = -1;
  }
}
