/**
 * A board that keeps to `server/wire/WIRE.md`, on a clock of its own that only `advanceTo` moves.
 * Nothing here reads a wall clock: a rehearsal runs it as fast as it can, and
 * `simulatedRigProcess.ts` paces it.
 */
import { blank } from '../../server/wire/codec.js';
import { type Frame, FrameDecoder } from '../../server/wire/frameDecoder.js';
import {
  type HostMessageName,
  MESSAGES,
  type MessageOf,
  RESET_CAUSE,
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import { type BoardOutput, NoOutput } from './boardOutput.js';
import { type BoardOptions, type BoardSetting, settingOf } from './boardSetting.js';
import { Commands } from './commands.js';
import { OutputBank } from './outputBank.js';
import { ILLEGAL, QuadratureDecoder } from './quadrature.js';
import { Voice } from './voice.js';
import { Xorshift32 } from './xorshift.js';

/** Told of every change of an output, as a probe on its pin would be. */
export type OutputProbe = (output: number, on: boolean, worldUs: number) => void;

export class Board {
  readonly setting: BoardSetting;
  readonly #voice: Voice;
  readonly #bank: OutputBank;
  readonly #commands: Commands;
  readonly #quadrature = new QuadratureDecoder();
  readonly #decoder: FrameDecoder;
  readonly #boots: Xorshift32;
  /** Board time is world time less this; a reset sets the board's clock to 0 again. */
  #offsetUs = 0;
  #nextTickUs = 0;
  #nextClockUs = 0;
  /** A host's words that came while the board was in the middle of something. */
  #inbox: { name: HostMessageName; message: object; tag: number }[] = [];
  #working = false;

  constructor(options: BoardOptions = {}, output: BoardOutput = new NoOutput()) {
    this.setting = settingOf(options);
    this.#boots = new Xorshift32(this.setting.seed);
    this.#voice = new Voice(this.setting, output);
    this.#bank = new OutputBank(this.setting, this.#voice);
    this.#commands = new Commands(this.#voice, this.#bank);
    this.#decoder = new FrameDecoder({
      frame: (frame) => this.#frame(frame),
      bad: () => this.#voice.countBadFrame(),
    });
    this.#offsetUs = -this.setting.startUs;
    this.#boot(RESET_CAUSE.powerOn, this.setting.startUs);
  }

  /** Changes who hears the board, as plugging a cable into another host does. */
  connect(output: BoardOutput): void {
    this.#voice.output = output;
  }

  /** Adds a probe, called at every change of an output. */
  probe(probe: OutputProbe): void {
    const earlier = this.#bank.probe;
    this.#bank.probe = (output, on, boardUs) => {
      earlier(output, on, boardUs);
      probe(output, on, boardUs + this.#offsetUs);
    };
  }

  /** Board time now, microseconds since reset (plus `startUs` on the first boot), not wrapped. */
  get boardUs(): number {
    return this.#voice.nowUs;
  }

  /** World time now: board time, but never set back by a reset. */
  get worldUs(): number {
    return this.#voice.nowUs + this.#offsetUs;
  }

  /** The encoder's count, signed 32 bits. */
  get count(): number {
    return this.#voice.count;
  }

  /** The current connection tag; 0 when there is none. */
  get tag(): number {
    return this.#voice.tag;
  }

  /** Bit n: output n is on. */
  get outputs(): number {
    return this.#voice.outputs;
  }

  /** The level at output n's pin: its idle level, or the other while it is on. */
  pinLevel(output: number): 0 | 1 {
    const line = this.#bank.lines[output]!;
    return line.on === line.idleHigh ? 0 : 1;
  }

  /** World time of the next change that an output makes by itself; Infinity without one. */
  get nextOutputUs(): number {
    return this.#bank.nextUs + this.#offsetUs;
  }

  /** Counts that the belt may move up (+1) or down (-1) before a slot could fire, that one included. */
  countsToSlot(direction: 1 | -1): number {
    const { slots } = this.#bank;
    return direction > 0 ? slots.upFrom(this.#voice.count) : slots.downFrom(this.#voice.count);
  }

  /** Lets time pass up to `worldUs`; everything due happens in order, at its own time. */
  advanceTo(worldUs: number): void {
    if (this.#working) throw new Error('advanceTo was called from inside the board');
    const until = worldUs - this.#offsetUs;
    const voice = this.#voice;
    const bank = this.#bank;
    this.#working = true;
    try {
      for (;;) {
        const tickUs = this.#nextTickUs;
        const dueUs = bank.nextUs;
        const nextUs = Math.min(dueUs, tickUs);
        if (nextUs > until) break;
        if (nextUs > voice.nowUs) voice.nowUs = nextUs;
        if (dueUs <= tickUs) bank.runDue();
        else this.#tick();
        if (this.#inbox.length > 0) this.#drain();
      }
      if (until > voice.nowUs) voice.nowUs = until;
    } finally {
      this.#working = false;
    }
  }

  /** Moves the encoder by so many counts at this moment, comparing slots at each of them. */
  move(counts: number): void {
    const { slots } = this.#bank;
    const voice = this.#voice;
    // A slot that was left behind may lie ahead again after a move the other way.
    if (slots.leftBehind > 0) slots.refresh(voice.count);
    let left = counts;
    while (left > 0) {
      const gap = slots.upFrom(voice.count);
      if (left < gap) {
        voice.count = (voice.count + left) | 0;
        return;
      }
      voice.count = (voice.count + gap) | 0;
      left -= gap;
      this.#reached(true);
    }
    while (left < 0) {
      const gap = slots.downFrom(voice.count);
      if (-left < gap) {
        voice.count = (voice.count + left) | 0;
        return;
      }
      voice.count = (voice.count - gap) | 0;
      left += gap;
      this.#reached(false);
    }
  }

  /** Sends a sample now, whenever the next one were due. */
  look(): void {
    this.#working = true;
    this.#voice.sample();
    this.#working = false;
    this.#drain();
  }

  /** One count up or down. */
  step(direction: 1 | -1): void {
    this.move(direction);
  }

  /** Levels at the encoder's two lines. */
  setQuadrature(a: 0 | 1, b: 0 | 1): void {
    const step = this.#quadrature.next(a, b);
    if (step === ILLEGAL) this.#voice.countIllegal();
    else if (step !== 0) this.move(step);
  }

  /** A fault to test with: counts that the slots' comparison never sees. */
  skipCounts(counts: number): void {
    this.#voice.count = (this.#voice.count + counts) | 0;
    this.#bank.slots.refresh(this.#voice.count);
  }

  /** An input's level (1: active); a change is told as an edge at this moment. */
  setInput(input: number, level: 0 | 1): void {
    const working = this.#working;
    this.#working = true;
    this.#voice.input(input, level);
    this.#working = working;
    if (!working) this.#drain();
  }

  /** Bytes lost by the receiver before they reached the decoder. */
  overrun(bytes: number): void {
    this.#voice.countOverruns(bytes);
  }

  /** What came over the line. */
  receiveBytes(bytes: Uint8Array): void {
    this.#decoder.push(bytes);
  }

  /** One whole host message, past the bytes; the message is taken at once or copied. */
  receive<N extends HostMessageName>(name: N, message: MessageOf[N], tag: number): void {
    if (this.#working) {
      this.#inbox.push({ name, message: { ...message }, tag });
      return;
    }
    this.#working = true;
    try {
      this.#commands.obey(name, message, tag);
      this.#drain();
    } finally {
      this.#working = false;
    }
  }

  /** Everything is forgotten, the outputs go idle, and the clock starts at 0. */
  reset(cause: number = RESET_CAUSE.resetPin): void {
    this.#bank.reset();
    this.#commands.reset();
    this.#offsetUs += this.#voice.nowUs;
    this.#decoder.reset();
    this.#inbox.length = 0;
    this.#boot(cause, 0);
  }

  #boot(cause: number, startUs: number): void {
    this.#nextTickUs = startUs + this.setting.reportUs;
    this.#nextClockUs = startUs + WIRE_TIMES.clockUs;
    this.#voice.boot(this.#boots.next(), cause, startUs);
  }

  #tick(): void {
    const voice = this.#voice;
    this.#nextTickUs += this.setting.reportUs;
    this.#commands.tick();
    voice.sampleIfDue();
    if (voice.nowUs >= this.#nextClockUs) {
      this.#nextClockUs += WIRE_TIMES.clockUs;
      voice.clock();
    }
  }

  #reached(rising: boolean): void {
    const working = this.#working;
    this.#working = true;
    this.#bank.reached(rising);
    this.#working = working;
    if (!working) this.#drain();
  }

  #drain(): void {
    const working = this.#working;
    this.#working = true;
    for (let i = 0; i < this.#inbox.length; i++) {
      const { name, message, tag } = this.#inbox[i]!;
      this.#commands.obey(name, message as never, tag);
    }
    this.#inbox.length = 0;
    this.#working = working;
  }

  readonly #heard = new Map<HostMessageName, object>();

  #frame(frame: Frame): void {
    const { name } = frame.shape;
    if (MESSAGES[name].from !== 'host') {
      this.#voice.countBadFrame();
      return;
    }
    const host = name as HostMessageName;
    let message = this.#heard.get(host);
    if (message === undefined) {
      message = blank(host);
      this.#heard.set(host, message);
    }
    frame.read(message);
    this.receive(host, message as never, frame.tag);
  }
}
