import { blank } from '../../server/wire/codec.js';
import {
  FAULT,
  type Outcome,
  PROTOCOL_VERSION,
  RESET_CAUSE,
  SYNC_EDGE,
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import type { BoardOutput } from './boardOutput.js';
import type { BoardSetting } from './boardSetting.js';
import { OutcomeRing } from './outcomeRing.js';

const WRAP = 0x1_0000_0000;

/**
 * What the board knows of itself and says: time, count, levels, counters, identity, and every
 * message to the host, each kind one object used again.
 */
export class Voice {
  nowUs = 0;
  count = 0;
  tag = 0;
  previousTag = 0;
  inputs = 0;
  outputs = 0;
  output: BoardOutput;
  readonly #setting: BoardSetting;
  readonly #ring: OutcomeRing;
  #illegal = 0;
  #badFrames = 0;
  #overruns = 0;
  #bootId = 0;
  #resetCause = 0;
  #lastSampleUs = 0;
  readonly #identity = blank('identity');
  readonly #sample = blank('sample');
  readonly #edge = blank('edge');
  readonly #outcome = blank('outcome');
  readonly #fault = blank('fault');
  readonly #clock = blank('clock');

  constructor(setting: BoardSetting, output: BoardOutput) {
    this.#setting = setting;
    this.output = output;
    this.#ring = new OutcomeRing(setting.outcomesKept);
    this.count = setting.startCount | 0;
    this.inputs = setting.startInputs;
  }

  /** Starts afresh, and speaks first: identity under tag 0. Inputs keep the levels they have. */
  boot(bootId: number, cause: number, startUs: number): void {
    if (this.#bootId !== 0) this.count = 0;
    this.nowUs = startUs;
    this.tag = 0;
    this.previousTag = 0;
    this.outputs = 0;
    this.#illegal = 0;
    this.#badFrames = 0;
    this.#overruns = 0;
    this.#bootId = bootId;
    this.#resetCause = cause;
    this.#lastSampleUs = startUs;
    this.#ring.clear();
    this.identity(0);
    if (cause === RESET_CAUSE.brownOut) this.fault(FAULT.brownOut, 0);
  }

  countIllegal(): void {
    this.#illegal = (this.#illegal + 1) & 0xffff;
  }

  countBadFrame(): void {
    this.#badFrames = (this.#badFrames + 1) & 0xff;
  }

  countOverruns(bytes: number): void {
    this.#overruns = (this.#overruns + bytes) & 0xff;
  }

  /** A sample now if anything differs from the last one told, or if that is 5 ms old. */
  sampleIfDue(): void {
    const told = this.#sample;
    const { nowUs, count, inputs, outputs } = this;
    if (
      count === told.count &&
      inputs === told.inputs &&
      outputs === told.outputs &&
      this.#illegal === told.illegal &&
      this.#badFrames === told.badFrames &&
      this.#overruns === told.overruns &&
      nowUs - this.#lastSampleUs < WIRE_TIMES.sampleMostUs
    ) {
      return;
    }
    this.sample();
  }

  /** A sample now. */
  sample(): void {
    const told = this.#sample;
    const { nowUs } = this;
    this.#lastSampleUs = nowUs;
    told.boardUs = nowUs < WRAP ? nowUs : nowUs % WRAP;
    told.count = this.count;
    told.inputs = this.inputs;
    told.outputs = this.outputs;
    told.illegal = this.#illegal;
    told.badFrames = this.#badFrames;
    told.overruns = this.#overruns;
    this.output.sample(told, this.tag);
  }

  /** An input's level, told as an edge if it changed. */
  input(input: number, level: 0 | 1): void {
    const bit = 1 << input;
    if (((this.inputs & bit) !== 0) === (level === 1)) return;
    this.inputs ^= bit;
    this.#sayEdge(input, level);
  }

  /** An edge that a sync train made. */
  syncEdge(output: number, level: 0 | 1): void {
    this.#sayEdge(SYNC_EDGE | output, level);
  }

  #sayEdge(input: number, level: 0 | 1): void {
    const edge = this.#edge;
    edge.boardUs = this.nowUs % WRAP;
    edge.count = this.count;
    edge.input = input;
    edge.level = level;
    this.output.edge(edge, this.tag);
  }

  /** Tells what became of an id, and keeps it. */
  outcome(id: number, kind: number, reason: number, output: number, onUs: number): void {
    const outcome = this.#outcome;
    outcome.id = id;
    outcome.kind = kind;
    outcome.reason = reason;
    outcome.output = output;
    outcome.repeated = 0;
    outcome.boardUs = this.nowUs % WRAP;
    outcome.count = this.count;
    outcome.onUs = onUs;
    this.#ring.keep(outcome);
    this.output.outcome(outcome, this.tag);
  }

  /** Tells everything kept about one id again. @returns false when nothing is kept */
  repeat(id: number): boolean {
    let found = false;
    this.#ring.each((kept) => {
      if (kept.id !== id) return;
      found = true;
      this.#tellAgain(kept);
    });
    return found;
  }

  /** Identity in answer to `nonce` (0: unasked), and then every outcome kept, oldest first. */
  identityAndOutcomes(nonce: number): void {
    this.identity(nonce);
    this.#ring.each((kept) => {
      this.#tellAgain(kept);
    });
  }

  #tellAgain(kept: Outcome): void {
    Object.assign(this.#outcome, kept);
    this.#outcome.repeated = 1;
    this.output.outcome(this.#outcome, this.tag);
  }

  /** Identity alone; `tag` and `kept` are given where the asker is not being let in. */
  identity(nonce: number, tag = this.tag, kept = this.#ring.kept): void {
    const identity = this.#identity;
    const setting = this.#setting;
    identity.nonce = nonce;
    identity.protocol = PROTOCOL_VERSION;
    identity.firmware = setting.firmware;
    identity.bootId = this.#bootId;
    identity.boardId = setting.boardId;
    identity.previousTag = this.previousTag;
    identity.capabilities = setting.capabilities;
    identity.outputs = setting.outputs;
    identity.inputs = setting.inputs;
    identity.slots = setting.slots;
    identity.outcomesKept = kept;
    identity.boardUs = this.nowUs % WRAP;
    identity.wraps = Math.floor(this.nowUs / WRAP) & 0xffff;
    identity.resetCause = this.#resetCause;
    identity.model = setting.model;
    this.output.identity(identity, tag);
  }

  fault(fault: number, detail: number, tag = this.tag): void {
    this.#fault.fault = fault;
    this.#fault.boardUs = this.nowUs % WRAP;
    this.#fault.detail = detail;
    this.output.fault(this.#fault, tag);
  }

  clock(): void {
    this.#clock.boardUs = this.nowUs % WRAP;
    this.#clock.wraps = Math.floor(this.nowUs / WRAP) & 0xffff;
    this.output.clock(this.#clock, this.tag);
  }
}
