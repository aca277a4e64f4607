import { blank, FrameEncoder } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import {
  type Edge,
  FAULT,
  type Fault,
  type HostMessageName,
  type Identity,
  type MessageOf,
  nameOf,
  type Outcome,
  PROTOCOL_VERSION,
  type Sample,
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import type { BoardLine } from './boardLine.js';
import { FrameHost, NotConforming, type Tagged } from './frameHost.js';

/** Samples come every 5 ms at least, and a USB line or a busy computer keeps bytes back as long again. */
const UNSEEN_US = 15_000;

type Heard<T> = Tagged<T> & { readonly sequence: number };

/** The host of the conformance scripts: speaks in frames alone, and keeps all that it hears. */
export class ConformanceHost extends FrameHost {
  readonly line: BoardLine;
  override readonly identities: Heard<Identity>[] = [];
  override readonly samples: Heard<Sample>[] = [];
  readonly clocks: number[] = [];
  /** The newest board stamp heard. */
  boardUs = 0;
  badFrames = 0;
  #nonce = 1000;
  readonly #encoder = new FrameEncoder();

  constructor(line: BoardLine) {
    super();
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
    // What lies in the computer's buffers was said before anything that was just asked for came there.
    for (let heardUs = Number.NaN; heardUs !== this.boardUs; ) {
      heardUs = this.boardUs;
      for (let turn = 0; turn < 4; turn++) await this.line.wait(0);
    }
    const fromUs = this.boardUs;
    for (let turn = 0; turn < us / 250 + 2_000; turn++) {
      await this.line.wait(1_000);
      if (((this.boardUs - fromUs) | 0) >= us + UNSEEN_US) return;
    }
  }

  get count(): number {
    return this.last(this.samples, 'sample').count;
  }

  /** Everything told of an id: `fired, done`. */
  told(id: number): string {
    return this.words(id).join(', ');
  }

  expectTold(id: number, expected: string, about = `id ${id}`): void {
    const told = this.told(id);
    this.check(told === expected, `${about}: expected "${expected}", was told "${told}"`);
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
    else if (name === 'edge') this.edges.push(message as Tagged<Edge>);
    else if (name === 'fault') this.faults.push(message as Tagged<Fault>);
    else if (name === 'clock') this.clocks.push((message as Sample).boardUs);
    else if (name === 'outcome') {
      const outcome = message as Tagged<Outcome>;
      this.outcomes.push(outcome);
      // A board that is not fresh from a reset has ids of its own past: rule 15.
      if (outcome.repeated === 1 && outcome.id >= this.nextId) this.nextId = outcome.id + 1;
    }
    const { boardUs } = message as { boardUs?: number };
    if (boardUs !== undefined && name !== 'outcome') this.boardUs = boardUs;
  }

  #keepSample(sample: Heard<Sample>): void {
    if (this.samples.length > 4_000) this.samples.splice(0, 2_000);
    this.samples.push(sample);
  }
}
