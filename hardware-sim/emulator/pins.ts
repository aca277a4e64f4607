import type { Chip } from './chip.js';
import type { Interrupt } from './interrupts.js';

const EIFR = 0x3c;
const EIMSK = 0x3d;
const PCIFR = 0x3b;
const PCICR = 0x68;

interface Port {
  readonly name: string;
  readonly at: { readonly pin: number; readonly ddr: number; readonly port: number };
  /** Bit n: something outside drives pin n, to the same bit of `level`. */
  driven: number;
  level: number;
  /** What was last seen at the pins. */
  seen: number;
}

/** Told of every change at the pins of a port that the chip itself made. */
export type PinProbe = (port: string, levels: number, changed: number, cycle: number) => void;

/**
 * The pins. Data sheet DS40002061, "Ports as General Digital I/O" (a one in PINx toggles PORTx; an
 * input with its PORTx bit set is pulled up), "External Interrupts" (any logical change; flags are
 * latched whether enabled or not, and cleared by a one), "Pin Change Interrupts".
 */
export class Pins {
  probe: PinProbe = () => {};
  readonly #chip: Chip;
  readonly #ports = new Map<string, Port>();
  readonly #external: { port: string; bit: number; interrupt: Interrupt }[];
  readonly #pinChange: Interrupt;

  constructor(chip: Chip) {
    this.#chip = chip;
    const { cpu, layout } = chip;
    const { data, readHooks, writeHooks } = cpu;
    for (const [name, at] of Object.entries(layout.ports)) {
      const port: Port = { name, at, driven: 0, level: 0, seen: 0 };
      this.#ports.set(name, port);
      readHooks[at.pin] = () => this.#levels(port);
      writeHooks[at.pin] = (value, _old, _address, mask) => {
        data[at.port]! ^= value & (mask ?? 0xff);
        this.#changed(port, true);
        return true;
      };
      for (const register of [at.ddr, at.port]) {
        writeHooks[register] = (value) => {
          data[register] = value;
          this.#changed(port, true);
          return true;
        };
      }
    }
    this.#external = layout.external.map(({ port, bit, flag, vector }) => ({
      port,
      bit,
      interrupt: {
        address: vector,
        flagRegister: EIFR,
        flagMask: 1 << flag,
        enableRegister: EIMSK,
        enableMask: 1 << flag,
      },
    }));
    const group = 1 << layout.pinChange.group;
    this.#pinChange = {
      address: layout.pinChange.vector,
      flagRegister: PCIFR,
      flagMask: group,
      enableRegister: PCICR,
      enableMask: group,
    };
    const external = this.#external.map(({ interrupt }) => interrupt);
    this.#hookFlags(EIFR, EIMSK, external);
    this.#hookFlags(PCIFR, PCICR, [this.#pinChange]);
  }

  /** Drives pin `bit` from outside; undefined lets go of it. */
  drive(portName: string, bit: number, level: 0 | 1 | undefined): void {
    const port = this.#ports.get(portName)!;
    const mask = 1 << bit;
    if (level === undefined) port.driven &= ~mask;
    else {
      port.driven |= mask;
      port.level = level === 1 ? port.level | mask : port.level & ~mask;
    }
    this.#changed(port, false);
  }

  /** Levels at the pins of a port; a pin that nothing drives or pulls up is low. */
  levels(portName: string): number {
    return this.#levels(this.#ports.get(portName)!);
  }

  /** Bit n: pin n is an output. */
  outputs(portName: string): number {
    return this.#chip.cpu.data[this.#ports.get(portName)!.at.ddr]!;
  }

  /** After a reset no pin is an output, and none is pulled up. */
  reset(): void {
    for (const port of this.#ports.values()) this.#changed(port, true);
  }

  #levels(port: Port): number {
    const { data } = this.#chip.cpu;
    const latch = data[port.at.port]!;
    const out = data[port.at.ddr]!;
    const outside = (port.level & port.driven) | (latch & ~port.driven);
    return ((latch & out) | (outside & ~out)) & 0xff;
  }

  #changed(port: Port, byChip: boolean): void {
    const { cpu, interrupts, layout } = this.#chip;
    const levels = this.#levels(port);
    const changed = levels ^ port.seen;
    if (changed === 0) return;
    port.seen = levels;
    for (const { port: name, bit, interrupt } of this.#external) {
      if (name === port.name && (changed & (1 << bit)) !== 0) interrupts.flag(interrupt);
    }
    const { pinChange } = layout;
    if (pinChange.port === port.name && (changed & cpu.data[pinChange.mask]!) !== 0) {
      interrupts.flag(this.#pinChange);
    }
    // An OUT takes effect at the end of its cycle.
    if (byChip) this.probe(port.name, levels, changed, cpu.cycles + 1);
  }

  #hookFlags(flags: number, enable: number, all: readonly Interrupt[]): void {
    const { cpu, interrupts } = this.#chip;
    cpu.writeHooks[flags] = (value) => {
      for (const one of all) if (value & one.flagMask) interrupts.clear(one);
      return true;
    };
    cpu.writeHooks[enable] = (value) => {
      cpu.data[enable] = value;
      for (const one of all) interrupts.enabled(one);
      return true;
    };
  }
}
