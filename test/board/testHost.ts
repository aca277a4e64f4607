import { Board } from '../../hardware-sim/board/board.js';
import type { BoardOutput } from '../../hardware-sim/board/boardOutput.js';
import type { BoardOptions } from '../../hardware-sim/board/boardSetting.js';
import { FrameHost } from '../../hardware-sim/conformance/frameHost.js';
import { FrameEncoder } from '../../server/wire/codec.js';
import {
  FAULT,
  type HostMessageName,
  type MessageOf,
  nameOf,
  PROTOCOL_VERSION,
} from '../../server/wire/messages.js';

export const TAG = 0x2b67;
const BEAT_US = 25_000;

export interface OutputChange {
  output: number;
  on: boolean;
  us: number;
}

/**
 * A host for tests of the simulated board, in its own process and at once. Times are world time, which
 * is board time until a reset (less `startUs`).
 */
export class TestHost extends FrameHost {
  readonly board: Board;
  readonly clocks: number[] = [];
  readonly changes: OutputChange[] = [];
  override tag = TAG;
  /** Off for hours of silence: the samples would cost more than the board itself. */
  keepSamples = true;
  readonly #encoder = new FrameEncoder();

  constructor(options: BoardOptions = {}) {
    super();
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

  get boardUs(): number {
    return this.board.boardUs;
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

  /** Everything told of an id, one after the other: `['fired', 'done']`. */
  told(id: number): string[] {
    return this.words(id);
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
