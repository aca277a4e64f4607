import { LapwingError } from '../errors/codes.js';
import { BY_HAND } from '../session/core/firings.js';
import type { StampedDecision } from '../session/decisions.js';
import { describeBoard } from '../session/description.js';
import { idleRules } from '../session/prepare.js';
import type { Rig } from '../session/rig/rig.js';
import { type SendCommand, SessionRunner } from '../session/runner.js';
import type { Edge, Identity, Outcome, Sample } from '../wire/messages.js';
import { OUTCOME } from '../wire/messages.js';
import { EventRing } from './eventRing.js';
import type { BenchItem, BenchNow, Tried, TryRequest } from './protocol.js';

const ITEMS_KEPT = 20_000;
/** Frames are told in parcels of so many. */
const FRAMES_A_PARCEL = 50;
/** A cause that is this old is refused by the board: whoever asked has looked away. */
const WINDOW_US = 100_000;
/** Into a vial: enough for any calibration, and no endless valve. */
const VIAL_NL = 50_000_000;

interface Pending {
  readonly serial: number;
  readonly output: string;
  readonly sentMs: number;
  riseUs: number | null;
  roundTripUs: number | null;
  resolve(tried: Tried): void;
  reject(error: Error): void;
}

/** What the loop is to its bench. */
export interface BenchHost {
  rig(): Rig;
  /** The board that answered last. */
  board(): Identity | undefined;
  readonly send: SendCommand;
  /** The bench's runner takes the board's frames from now on. */
  begin(runner: SessionRunner): void;
  /** It does so no longer. */
  ended(): void;
}

/**
 * What a rig shows and does while nobody is in a session: raw edges for whoever watches, and outputs
 * tried one pulse at a time, through the guards and the board's own limits like any other.
 */
export class Bench {
  readonly items = new EventRing<BenchItem>(ITEMS_KEPT);
  /** Somebody watches: items are kept. */
  #watched = false;
  /** Frames are timed too: each one's board time and when it was taken. */
  #timed = false;
  readonly #host: BenchHost;
  /** Outputs may be tried: by this runner, a valve's water going there. */
  #open: { readonly runner: SessionRunner; readonly into: TryRequest['into'] } | undefined;
  #atUs = 0;
  #count = 0;
  #frames: number[] = [];
  #pending: Pending | undefined;
  #serial = 0;
  /** Told at the next frame, or when the bench is closed. */
  #onFrame: (() => void) | undefined;

  constructor(host: BenchHost) {
    this.#host = host;
  }

  /** Where the newest frame found the belt. */
  get now(): BenchNow {
    const board = this.#host.board();
    return { atUs: this.#atUs, count: this.#count, board: board ? describeBoard(board) : null };
  }

  watch(watched: boolean, timed: boolean): void {
    this.#watched = watched;
    this.#timed = timed;
    // Whoever tried outputs has gone: nothing that was begun goes on.
    if (!watched) this.close('nobody watches the bench any more');
  }

  sample(message: Sample, atUs: number): void {
    if (!this.#watched) return;
    this.#atUs = atUs;
    this.#count = message.count;
    this.#onFrame?.();
    if (!this.#timed) return;
    this.#frames.push(atUs, performance.now() * 1_000);
    if (this.#frames.length < 2 * FRAMES_A_PARCEL) return;
    this.items.push({ is: 'frames', us: this.#frames });
    this.#frames = [];
  }

  edge({ count, input, level }: Edge, atUs: number): void {
    if (!this.#watched) return;
    this.items.push({ is: 'edge', atUs, count, line: input, level: level === 1 ? 1 : 0 });
  }

  outcome({ kind, output, repeated }: Outcome, atUs: number): void {
    if (!this.#watched || repeated !== 0) return;
    if (kind !== OUTCOME.fired && kind !== OUTCOME.done) return;
    this.items.push({ is: 'output', atUs, line: output, on: kind === OUTCOME.fired });
  }

  /**
   * One pulse, now. Resolves when the board has said what became of it.
   * @throws LapwingError BENCH_WITHHELD with the guard's reason, BENCH_LATE, BENCH_BUSY, BENCH_STOPPED
   */
  async attempt({ output: name, widthUs, into }: TryRequest): Promise<Tried> {
    if (this.#pending !== undefined || this.#onFrame !== undefined) {
      const busy = this.#pending?.output ?? 'another output';
      throw new LapwingError('benchBusy', `${busy} is still under way.`);
    }
    const { outputs } = this.#host.rig();
    const output = outputs.find((one) => one.name === name);
    if (output === undefined) {
      const known = outputs.map((one) => one.name).join(', ');
      throw new LapwingError('benchWithheld', `No output is \`${name}\`: there is ${known}.`);
    }
    if (!Number.isInteger(widthUs) || (into !== 'vial' && into !== 'spout')) {
      throw new LapwingError('benchWithheld', 'Expected whole microseconds, into vial or spout.');
    }
    const { core } = await this.#openFor(into);
    const serial = ++this.#serial;
    const { nowUs } = core.instant;
    const withheld = core.firings.fire({
      rule: BY_HAND,
      serial,
      causeUs: nowUs,
      expiryUs: nowUs + WINDOW_US,
      placeTravel: Number.NaN,
      withinCounts: 0,
      sham: false,
      orders: [
        {
          ...{ output: output.line, volumeNl: 0, widthUs, periodUs: 0 },
          ...{ repeats: 1, stoppable: false, delayUs: 0 },
        },
      ],
    });
    if (withheld !== undefined) throw new LapwingError('benchWithheld', `${withheld}.`);
    return new Promise((resolve, reject) => {
      const sentMs = performance.now();
      const [riseUs, roundTripUs] = [null, null];
      this.#pending = { serial, output: name, sentMs, riseUs, roundTripUs, resolve, reject };
    });
  }

  /** Only now does the board get limits: what is not configured never fires. */
  async #openFor(into: TryRequest['into']): Promise<SessionRunner> {
    if (this.#open?.into === into) return this.#open.runner;
    const rig = this.#host.rig();
    const runner = new SessionRunner(
      {
        ...{ rig: benchRig(rig, into), program: idleRules(rig), title: '', seed: '' },
        waterTodayNl: 0,
      },
      this.#host.send,
      undefined,
      (decision) => this.#decided(decision),
    );
    this.#open = { runner, into };
    this.#host.begin(runner);
    // A pulse is asked by the time of a frame, and the runner has had none yet.
    await new Promise<void>((resolve) => {
      this.#onFrame = resolve;
    });
    this.#onFrame = undefined;
    if (this.#open?.runner === runner) return runner;
    throw new LapwingError('benchStopped', 'The bench was closed meanwhile.');
  }

  /** What was decided of the pulse that is under way. */
  #decided(decision: StampedDecision): void {
    const pending = this.#pending;
    if (pending === undefined) return;
    switch (decision.kind) {
      case 'fired':
        if (decision.output !== pending.output) return;
        pending.riseUs = decision.riseUs;
        pending.roundTripUs = (performance.now() - pending.sentMs) * 1_000;
        return;
      case 'pulse done':
        if (decision.output !== pending.output) return;
        this.#pending = undefined;
        pending.resolve({
          ...{ output: pending.output, riseUs: pending.riseUs, onUs: decision.onUs },
          ...{ volumeNl: decision.volumeNl, roundTripUs: pending.roundTripUs },
        });
        return;
      case 'refused':
      case 'missed':
      case 'uncertain': {
        if (decision.serial !== pending.serial) return;
        this.#pending = undefined;
        const code = decision.kind === 'missed' ? 'benchLate' : 'benchWithheld';
        pending.reject(new LapwingError(code, `The board did not do it: ${decision.reason}.`));
        return;
      }
    }
  }

  /** Outputs go idle, and nothing more comes of what is under way. */
  close(why: string): void {
    if (this.#open === undefined) return;
    this.#open = undefined;
    this.#onFrame?.();
    this.#pending?.reject(new LapwingError('benchStopped', `${why}.`));
    this.#pending = undefined;
    this.#host.ended();
  }
}

/** The rig as it is tried: no sync train; into a vial, none of the limits of an animal's water. */
export function benchRig(rig: Rig, into: TryRequest['into']): Rig {
  const bare = { ...rig, sync: undefined };
  if (into === 'spout') return bare;
  const water = { ...rig.water, perSessionNl: VIAL_NL, perDayNl: VIAL_NL };
  const outputs = rig.outputs.map((output) =>
    output.kind === 'valve' ? { ...output, perSession: undefined } : output,
  );
  return { ...bare, water, outputs };
}
