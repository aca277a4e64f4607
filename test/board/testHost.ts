import { Board } from '../../hardware-sim/board/board.js';
import type { BoardOutput } from '../../hardware-sim/board/boardOutput.js';
import type { BoardOptions } from '../../hardware-sim/board/boardSetting.js';
import { blank, FrameEncoder } from '../../server/wire/codec.js';
import {
  type Arm,
  type Configure,
  type Edge,
  FAULT,
  type Fault,
  type HostMessageName,
  type Identity,
  type MessageOf,
  nameOf,
  OUTCOME,
  type Outcome,
  PROTOCOL_VERSION,
  type Pulse,
  REASON,
  type Sample,
} from '../../server/wire/messages.js';

export const TAG = 0x2b67;
const BEAT_US = 25_000;

export type Tagged<T> = T & { tag: number };
export interface OutputChange {
  output: number;
  on: boolean;
  us: number;
}

/**
 * A host for tests of the board: keeps all that it hears, and beats only while told to. Times are
 * world time, which is board time until a reset (less `startUs`).
 */
export class TestHost {
  readonly board: Board;
  readonly identities: Tagged<Identity>[] = [];
  readonly samples: Tagged<Sample>[] = [];
  readonly edges: Tagged<Edge>[] = [];
  readonly outcomes: Tagged<Outcome>[] = [];
  readonly faults: Tagged<Fault>[] = [];
  readonly clocks: number[] = [];
  readonly changes: OutputChange[] = [];
  tag = TAG;
  /** Off for hours of silence: the samples would cost more than the board itself. */
  keepSamples = true;
  wanted = 0xffff_ffff;
  #nextId = 1;
  readonly #encoder = new FrameEncoder();

  constructor(options: BoardOptions = {}) {
    const output: BoardOutput = {
      identity: (message, tag) => this.identities.push({ ...message, tag }),
      sample: (message, tag) => {
        if (this.keepSamples) this.samples.push({ ...message, tag });
      },
      edge: (message, tag) => this.edges.push({ ...message, tag }),
      outcome: (message, tag) => this.outcomes.push({ ...message, tag }),
      fault: (message, tag) => this.faults.push({ ...message, tag }),
      clock: (message) => this.clocks.push(message.wraps * 2 ** 32 + message.boardUs),
    };
    this.board = new Board(options, output);
    this.board.probe((number, on, us) => this.changes.push({ output: number, on, us }));
  }

  get nowUs(): number {
    return this.board.worldUs;
  }

  /** Connects, with output 0 and 1 configured generously. */
  static connected(options: BoardOptions = {}): TestHost {
    const host = new TestHost(options);
    host.identify();
    host.beat();
    host.configure({ output: 0 });
    host.configure({ output: 1 });
    return host;
  }

  send<N extends HostMessageName>(name: N, message: MessageOf[N], tag = this.tag): void {
    this.board.receive(name, message, tag);
  }

  /** The same, through bytes. */
  sendBytes<N extends HostMessageName>(name: N, message: MessageOf[N], tag = this.tag): void {
    this.board.receiveBytes(this.#encoder.encode(name, message, tag));
  }

  identify(newTag = this.tag): void {
    this.tag = newTag;
    this.send('identify', { nonce: 77, protocol: PROTOCOL_VERSION, newTag });
  }

  beat(finishedUs = this.board.boardUs): void {
    this.send('beat', { finishedUs, wanted: this.wanted });
  }

  configure(changes: Partial<Configure>): void {
    this.send('configure', {
      output: 0,
      flags: 0,
      longestOnUs: 1_000_000,
      leastGapUs: 0,
      allowanceUs: 100_000_000,
      allowanceRises: 10_000,
      leastCounts: 0,
      ...changes,
    });
  }

  /** Asks for a pulse of 10 ms on output 0, now. @returns its id */
  pulse(changes: Partial<Pulse> = {}): number {
    const pulse = this.pulseMessage(changes);
    this.send('pulse', pulse);
    return pulse.id;
  }

  pulseMessage(changes: Partial<Pulse> = {}): Pulse {
    const id = changes.id ?? this.#nextId++;
    return {
      ...blank('pulse'),
      widthUs: 10_000,
      repeats: 1,
      expiryUs: this.board.boardUs + 50_000,
      ...changes,
      id,
    };
  }

  /** Arms slot 0 to pulse output 0 for 10 ms. @returns its id */
  arm(changes: Partial<Arm> = {}): number {
    const arm = this.armMessage(changes);
    this.send('arm', arm);
    return arm.id;
  }

  armMessage(changes: Partial<Arm> = {}): Arm {
    const id = changes.id ?? this.#nextId++;
    return { ...blank('arm'), rising: 1, widthUs: 10_000, repeats: 1, ...changes, id };
  }

  /** Lets time pass while the host is alive and beats. */
  live(us: number): void {
    const endUs = this.nowUs + us;
    while (this.nowUs < endUs) {
      this.board.advanceTo(Math.min(endUs, this.nowUs + BEAT_US));
      this.beat();
    }
  }

  /** Lets time pass while the host says nothing. */
  silent(us: number): void {
    this.board.advanceTo(this.nowUs + us);
  }

  /** What was told of an id, in words: `fired`, `done`, `refused busy`, `done silence again`. */
  told(id: number): string[] {
    return this.outcomes
      .filter((outcome) => outcome.id === id)
      .map((outcome) => {
        const words = [nameOf(OUTCOME, outcome.kind)];
        if (outcome.reason !== REASON.none) words.push(nameOf(REASON, outcome.reason));
        if (outcome.repeated === 1) words.push('again');
        return words.join(' ');
      });
  }

  outcome(id: number, kind: keyof typeof OUTCOME): Tagged<Outcome> {
    const found = this.outcomes.find((one) => one.id === id && one.kind === OUTCOME[kind]);
    if (found === undefined) throw new Error(`id ${id} was never ${kind}: ${this.told(id)}`);
    return found;
  }

  faultNames(): string[] {
    return this.faults.map((fault) => nameOf(FAULT, fault.fault));
  }

  /** When an output was on, as [rise, fall]; a pulse still on has no fall. */
  pulses(output = 0): [number, number | undefined][] {
    const pulses: [number, number | undefined][] = [];
    for (const change of this.changes) {
      if (change.output !== output) continue;
      if (change.on) pulses.push([change.us, undefined]);
      else pulses[pulses.length - 1]![1] = change.us;
    }
    return pulses;
  }
}
