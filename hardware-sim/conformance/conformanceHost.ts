import { blank, FrameEncoder } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
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
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import type { BoardLine } from './boardLine.js';

export type Heard<T> = T & { readonly tag: number; readonly sequence: number };

/** What a script expected and the board did not do. */
export class NotConforming extends Error {}

/** The host of the conformance scripts: speaks in frames alone, and keeps all that it hears. */
export class ConformanceHost {
  readonly line: BoardLine;
  readonly identities: Heard<Identity>[] = [];
  readonly samples: Heard<Sample>[] = [];
  readonly edges: Heard<Edge>[] = [];
  readonly outcomes: Heard<Outcome>[] = [];
  readonly faults: Heard<Fault>[] = [];
  readonly clocks: number[] = [];
  tag = 0;
  wanted = 0xffff_ffff;
  /** The newest board stamp heard. */
  boardUs = 0;
  badFrames = 0;
  #nonce = 1000;
  #nextId = 1;
  readonly #encoder = new FrameEncoder();

  constructor(line: BoardLine) {
    this.line = line;
    const decoder = new FrameDecoder({
      frame: (frame) => {
        const message = blank(frame.shape.name);
        frame.read(message);
        this.#hear(frame.shape.name, { ...message, tag: frame.tag, sequence: frame.sequence });
      },
      bad: () => this.badFrames++,
    });
    line.heard = (bytes) => decoder.push(bytes);
    line.write(Uint8Array.of(0));
  }

  get identity(): Heard<Identity> {
    return this.last(this.identities, 'identity');
  }

  send<N extends HostMessageName>(name: N, message: MessageOf[N], tag = this.tag): void {
    this.line.write(this.#encoder.encode(name, message, tag).slice());
  }

  /** The bytes of a frame, to be spoilt before they are written. */
  bytes<N extends HostMessageName>(name: N, message: MessageOf[N]): Uint8Array {
    return this.#encoder.encode(name, message, this.tag).slice();
  }

  /** Under a tag that no script had before; forgets what was heard. */
  async identify(newTag = 1 + ((this.tag + 0x2b67) % 0xfffe)): Promise<void> {
    this.identities.length = 0;
    const nonce = ++this.#nonce;
    this.send('identify', { nonce, protocol: PROTOCOL_VERSION, newTag }, newTag);
    this.tag = newTag;
    for (let n = 0; n < 40 && this.identities.at(-1)?.nonce !== nonce; n++) {
      await this.wait(5_000);
    }
    this.check(this.identity.nonce === nonce, 'identity never answered identify');
    // What was kept follows.
    await this.wait(1_000 + 800 * this.identity.outcomesKept);
  }

  /** A fresh connection, outputs 0 and 1 generously configured, everything else never on. */
  async connect(): Promise<void> {
    this.wanted = 0xffff_ffff;
    this.send('quiet', { outputs: 0xffff });
    await this.identify();
    for (const list of [this.samples, this.edges, this.outcomes, this.faults, this.clocks]) {
      list.length = 0;
    }
    await this.wait(6_000);
    this.beat();
    this.configure({ output: 0 });
    this.configure({ output: 1 });
    await this.wait(3_000);
  }

  beat(finishedUs = this.boardUs): void {
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

  newId(): number {
    return this.#nextId++;
  }

  pulseMessage(changes: Partial<Pulse> = {}): Pulse {
    return {
      ...blank('pulse'),
      widthUs: 10_000,
      repeats: 1,
      expiryUs: this.boardUs + 100_000,
      ...changes,
      id: changes.id ?? this.newId(),
    };
  }

  /** Asks for a pulse of 10 ms on output 0, now. @returns its id */
  pulse(changes: Partial<Pulse> = {}): number {
    const pulse = this.pulseMessage(changes);
    this.send('pulse', pulse);
    return pulse.id;
  }

  /** Arms slot 0 to pulse output 0 for 10 ms. @returns its id */
  arm(changes: Partial<Arm> = {}): number {
    const id = changes.id ?? this.newId();
    this.send('arm', { ...blank('arm'), rising: 1, widthUs: 10_000, repeats: 1, ...changes, id });
    return id;
  }

  /** Lets time pass while the host is alive and beats. */
  async live(us: number): Promise<void> {
    for (let left = us; left > 0; left -= WIRE_TIMES.beatUs) {
      await this.wait(Math.min(left, WIRE_TIMES.beatUs));
      this.beat();
    }
    await this.wait(4_000);
  }

  /** Lets time pass while the host says nothing. */
  silent(us: number): Promise<void> {
    return this.wait(us);
  }

  /**
   * Lets board time pass. A board that lives in real time tells by its samples how much has: a busy
   * computer's own clock would not say what the board has had time for.
   */
  async wait(us: number): Promise<void> {
    if (this.line.realTime !== true) return this.line.wait(us);
    const fromUs = this.boardUs;
    for (let turn = 0; turn < us / 250 + 2_000; turn++) {
      await this.line.wait(1_000);
      // Samples come every 5 ms at least: what the newest shows may be so much behind.
      if (((this.boardUs - fromUs) | 0) >= us + 5_000) return;
    }
  }

  get count(): number {
    return this.last(this.samples, 'sample').count;
  }

  /** What was told of an id, in words: `fired`, `done`, `refused busy`, `done silence again`. */
  told(id: number): string {
    return this.outcomes
      .filter((outcome) => outcome.id === id)
      .map((outcome) => {
        const words = [nameOf(OUTCOME, outcome.kind)];
        if (outcome.reason !== REASON.none) words.push(nameOf(REASON, outcome.reason));
        if (outcome.repeated === 1) words.push('again');
        return words.join(' ');
      })
      .join(', ');
  }

  expectTold(id: number, expected: string, about = `id ${id}`): void {
    const told = this.told(id);
    this.check(told === expected, `${about}: expected "${expected}", was told "${told}"`);
  }

  outcome(id: number, kind: keyof typeof OUTCOME): Heard<Outcome> {
    const found = this.outcomes.find((one) => one.id === id && one.kind === OUTCOME[kind]);
    if (!found) throw new NotConforming(`id ${id} was never ${kind}; told "${this.told(id)}"`);
    return found;
  }

  expectFaults(expected: string): void {
    const told = this.faults.map(({ fault }) => nameOf(FAULT, fault)).join(', ');
    this.check(told === expected, `faults: expected "${expected}", was told "${told}"`);
  }

  near(value: number, expected: number, tolerance: number, what: string): void {
    const far = Math.abs(value - expected) > tolerance;
    this.check(!far, `${what}: expected ${expected} (within ${tolerance}), was ${value}`);
  }

  check(good: boolean, why: string): void {
    if (!good) throw new NotConforming(why);
  }

  last<T>(list: readonly T[], what: string): T {
    const last = list.at(-1);
    if (last === undefined) throw new NotConforming(`no ${what} was heard`);
    return last;
  }

  #hear(name: string, message: object): void {
    if (name === 'identity') this.identities.push(message as Heard<Identity>);
    else if (name === 'sample') this.#keepSample(message as Heard<Sample>);
    else if (name === 'edge') this.edges.push(message as Heard<Edge>);
    else if (name === 'fault') this.faults.push(message as Heard<Fault>);
    else if (name === 'clock') this.clocks.push((message as Sample).boardUs);
    else if (name === 'outcome') {
      const outcome = message as Heard<Outcome>;
      this.outcomes.push(outcome);
      // A board that is not fresh from a reset has ids of its own past: rule 15.
      if (outcome.repeated === 1 && outcome.id >= this.#nextId) this.#nextId = outcome.id + 1;
    }
    const { boardUs } = message as { boardUs?: number };
    if (boardUs !== undefined && name !== 'outcome') this.boardUs = boardUs;
  }

  #keepSample(sample: Heard<Sample>): void {
    if (this.samples.length > 4_000) this.samples.splice(0, 2_000);
    this.samples.push(sample);
  }
}
