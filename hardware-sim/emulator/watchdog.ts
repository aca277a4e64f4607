import type { Chip, TimedPart } from './chip.js';

const WDTCSR = 0x60;
const BIT = { wdce: 0x10, wde: 0x08 } as const;
const NEVER = Number.POSITIVE_INFINITY;
/** 2048 cycles of the 128 kHz oscillator, in the chip's own. */
const SHORTEST_CYCLES = 16_000 * 16;

/**
 * The chip's watchdog in system reset mode. Data sheet DS40002061, "Watchdog Timer": the timed
 * sequence (a change within four cycles of setting WDCE and WDE), WDP3:0 (16 ms to 8 s), and WDE
 * held on while WDRF is set.
 */
export class Watchdog implements TimedPart {
  due = NEVER;
  readonly #chip: Chip;
  readonly #bark: () => void;
  #mayChangeUntil = -1;

  constructor(chip: Chip, bark: () => void) {
    this.#chip = chip;
    this.#bark = bark;
    const { cpu } = chip;
    cpu.onWatchdogReset = () => this.#restart();
    cpu.writeHooks[WDTCSR] = (value) => {
      const may = cpu.cycles <= this.#mayChangeUntil;
      if ((value & (BIT.wdce | BIT.wde)) === (BIT.wdce | BIT.wde)) {
        this.#mayChangeUntil = cpu.cycles + 4;
        cpu.data[WDTCSR]! |= BIT.wde;
      } else if (may) {
        cpu.data[WDTCSR] = value & ~BIT.wdce;
        this.#mayChangeUntil = -1;
      }
      this.#restart();
      return true;
    };
  }

  act(): void {
    this.due = NEVER;
    this.#bark();
  }

  /** @param byItself after its own reset it stays on, at the shortest time */
  reset(byItself: boolean): void {
    this.#chip.cpu.data[WDTCSR] = byItself ? BIT.wde : 0;
    this.#mayChangeUntil = -1;
    this.#restart();
  }

  #restart(): void {
    const { cpu } = this.#chip;
    const setting = cpu.data[WDTCSR]!;
    const power = (setting & 7) | ((setting & 0x20) >> 2);
    this.due = setting & BIT.wde ? cpu.cycles + SHORTEST_CYCLES * 2 ** power : NEVER;
    this.#chip.reschedule();
  }
}
