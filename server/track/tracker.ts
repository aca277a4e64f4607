// One file, since a frame passes clock, count, mark and lap in one order that has to be seen whole.
import type { Instant, Trust } from '../rules/instant.js';
import {
  type Clock,
  type Edge,
  OUTCOME,
  type Outcome,
  type Sample,
  SYNC_EDGE,
} from '../wire/messages.js';
import { extend32 } from '../wire/time.js';
import { type BeltConfig, SPEED_WINDOW_US, UNSEEN_US } from './beltConfig.js';
import { BeltScale } from './beltScale.js';
import { BoardClock } from './boardClock.js';
import { DeclaredStart } from './declaredStart.js';
import type { TrackEvent, TrackListener } from './events.js';
import { InputLevels } from './inputLevels.js';
import { SeamFollower } from './seamFollower.js';
import { SpeedWindow } from './speedWindow.js';

/** Inputs have a bit each in a sample. */
const INPUTS = 16;

export { blankInstant } from './blankInstant.js';

/**
 * Decoded board frames in, the motion part of an `Instant` out: one frame, one instant.
 *
 * Travel is the belt unrolled in whole counts, lap n beginning at `n * lapCounts`.
 */
export class Tracker {
  readonly lapCounts: number;
  readonly #scale: BeltScale;
  readonly #clock = new BoardClock();
  readonly #speed: SpeedWindow;
  readonly #seam: SeamFollower | null;
  readonly #seamInput: number;
  readonly #levels: InputLevels;
  readonly #direction: 1 | -1;
  readonly #cmPerCount: number;
  readonly #events: TrackEvent[] = [];
  readonly #listener: TrackListener | undefined;
  /** In force without a seam mark. */
  readonly #start = new DeclaredStart(this.#events);

  /** The belt's count, extended, and whether it is known at all. */
  #count = 0;
  #counted = false;
  /** Counts in `direction`, and what turns them into travel. */
  #moved = 0;
  #offset = 0;
  #homed = false;
  #travel = 0;
  #progress = 0;
  #lap = 0;
  #placed = false;
  #forwards = true;
  /** The same before the newest frame's movement, for edges which that frame overtook. */
  #movedBefore = 0;
  #forwardsBefore = true;
  /** The next frame's movement happened unseen. */
  #unseen = false;
  #hand = false;
  #newestUs = 0;
  // Where this instant's movement began.
  #travelFrom = 0;
  #progressFrom = 0;

  constructor(config: BeltConfig, listener?: TrackListener) {
    this.#scale = new BeltScale(config.lengthCm, config.countsPerCm);
    this.lapCounts = this.#scale.lapCounts;
    this.#cmPerCount = this.#scale.cmPerCount;
    this.#direction = config.direction;
    this.#listener = listener;
    this.#speed = new SpeedWindow(config.speedWindowUs ?? SPEED_WINDOW_US);
    const { seam, lick } = config;
    this.#seam =
      seam === null ? null : new SeamFollower(seam, this.lapCounts, this.#cmPerCount, this.#events);
    this.#seamInput = seam === null ? -1 : seam.input;
    this.#levels = new InputLevels(lick, this.#events);
  }

  /** Extended board time of the newest instant, microseconds. */
  get nowUs(): number {
    return this.#clock.nowUs;
  }

  /** The last frame's own stamp, extended: what a cause is reckoned from. At most `nowUs`. */
  get stampUs(): number {
    return this.#clock.stampUs;
  }

  get trust(): Trust {
    return (this.#seam ?? this.#start).trust;
  }

  /** Why trust is what it is, in words for the screen. */
  get trustReason(): string {
    return (this.#seam ?? this.#start).reason;
  }

  /** Output states as the board last told them, bit n for output n. */
  get outputs(): number {
    return this.#levels.outputs;
  }

  /** The lick sensor is touched now. */
  get contact(): boolean {
    return this.#levels.lick?.contact ?? false;
  }

  /** A sample: the instant at its stamp. */
  sample(m: Sample, into: Instant): void {
    const newest = this.#clock.take(m.boardUs);
    this.#begin();
    if (newest) this.#move(m.count);
    this.#levels.sample(m.inputs, m.outputs, this.#clock.stampUs);
    this.#end(into);
  }

  /** An edge: the instant at its stamp, or at the newest sample's when that overtook it. */
  edge(m: Edge, into: Instant): void {
    const newest = this.#clock.take(m.boardUs);
    this.#begin();
    if (newest || !this.#counted) this.#move(m.count);
    else this.#headAt(extend32(this.#count, m.count) * this.#direction);
    const rose = m.level === 1;
    const { stampUs } = this.#clock;
    if (m.input < INPUTS) this.#levels.edge(m, stampUs);
    else if ((m.input & SYNC_EDGE) !== 0) {
      this.#levels.outputIs(m.input & ~SYNC_EDGE, rose, stampUs);
    }
    if (m.input === this.#seamInput) {
      const moved = extend32(this.#count, m.count) * this.#direction;
      this.#seamEdge(rose, newest ? this.#forwards : this.#forwardsBefore, moved);
    }
    // An overtaken edge may tell that the belt has been further than any sample showed.
    if (!newest && this.#homed) this.#wasAt(this.travelAtCount(m.count));
    this.#end(into);
  }

  /**
   * An outcome: no instant of its own, but it says exactly when an output changed.
   * @returns the outcome's own stamp, extended
   */
  outcome(m: Outcome): number {
    const stampUs = this.#clock.extend(m.boardUs);
    if (m.repeated !== 0) return stampUs;
    const fired = m.kind === OUTCOME.fired;
    if (fired || m.kind === OUTCOME.done) this.#levels.outputIs(m.output, fired, stampUs);
    return stampUs;
  }

  /** The instant as it stands, without movement: for an input that is no frame of the belt. */
  unmoved(into: Instant): void {
    this.#begin();
    this.#end(into);
  }

  /**
   * A clock frame, or a handshake: time is right again after a silence longer than time's wrap.
   * After a restart call `linkResumed(false)` first.
   */
  clock(m: Clock): void {
    this.#clock.takeWraps(m.wraps, m.boardUs);
  }

  /** The board began anew: its time, its count and so the position are not what they were. */
  boardRestarted(): void {
    this.#clock.restarted();
    this.#counted = false;
    this.#levels.forget();
    this.#lost('the board restarted');
  }

  /**
   * A hand turns the belt: position is unknown and no mark is believed until the hand is off, and
   * then until the next mark. Without a mark, the belt stands at 0 cm when the hand leaves it.
   */
  hand(on: boolean): void {
    this.#hand = on;
    this.#lost(on ? 'a hand is on the belt' : 'a hand was on the belt');
    if (!on) this.declareStart();
  }

  #lost(why: string): void {
    this.#homed = false;
    this.#placed = false;
    this.#seam?.lost(`${why}; waiting for the seam mark`);
    this.#start.lost(`${why}; the start must be declared again`);
    this.#flush();
  }

  /**
   * Frames come again. Of the same boot: laps go on, and places passed meanwhile are missed. Of
   * another: `boardRestarted`.
   */
  linkResumed(sameBoot: boolean): void {
    if (sameBoot) this.#unseen = true;
    else this.boardRestarted();
    this.#levels.forget();
  }

  /**
   * On a rig without a seam mark: where the belt stands now is 0 cm, and the next lap begins. The
   * first frame of a session declares it by itself; after a board restart a person must.
   */
  declareStart(): void {
    if (this.#seam !== null || !this.#counted) return;
    this.#home((this.#lap + 1) * this.lapCounts);
    this.#start.declared();
  }

  /**
   * The board's 32-bit count at which the belt, moving `forwards` or backwards, has come to
   * `travelCounts`.
   * @throws RangeError while position is unknown
   */
  boardCountAt(travelCounts: number, forwards = true): number {
    if (!this.#homed) throw new RangeError('position is unknown: no count stands for a place');
    const travel = forwards ? Math.ceil(travelCounts) : Math.floor(travelCounts);
    return ((travel - this.#offset) * this.#direction) | 0;
  }

  /** True when the board's count rises as the belt moves `forwards` (or backwards). */
  countRises(forwards: boolean): boolean {
    return forwards === (this.#direction === 1);
  }

  /** Travel at a 32-bit board count near now, by today's correction; NaN while unknown. */
  travelAtCount(count: number): number {
    if (!this.#homed) return Number.NaN;
    return extend32(this.#count, count) * this.#direction + this.#offset;
  }

  /** Place along the belt, [0, length) cm. */
  positionCmOf(travelCounts: number): number {
    return this.#scale.positionCmOf(travelCounts);
  }

  /** Travel at `placeCm` of lap `lap`, counts; not a whole number as a rule. */
  travelOf(lap: number, placeCm: number): number {
    return this.#scale.travelOf(lap, placeCm);
  }

  /** A stamp of the board's near now, extended. */
  extend(boardUs: number): number {
    return this.#clock.extend(boardUs);
  }

  /** What the board's clock says at extended time `us`: what commands to it must carry. */
  toBoardUs(us: number): number {
    return this.#clock.toBoard(us);
  }

  // ---- one frame -----------------------------------------------------------------------------

  #begin(): void {
    this.#travelFrom = this.#travel;
    this.#progressFrom = this.#progress;
    this.#levels.begin();
  }

  #move(raw: number): void {
    const nowUs = this.#clock.nowUs;
    if (!this.#counted) {
      this.#firstCount(raw, nowUs);
      return;
    }
    const count = this.#count + ((raw - this.#count) | 0);
    const silentUs = nowUs - this.#newestUs;
    this.#newestUs = nowUs;
    this.#movedBefore = this.#moved;
    this.#forwardsBefore = this.#forwards;
    if (count === this.#count && !this.#unseen) return;
    const moved = count * this.#direction;
    const by = moved - this.#moved;
    this.#count = count;
    this.#moved = moved;
    if (by !== 0) this.#forwards = by > 0;
    if (!this.#homed) {
      this.#unseen = false;
      return;
    }
    const travel = moved + this.#offset;
    this.#travel = travel;
    this.#wasAt(travel);
    if (this.#unseen || silentUs > UNSEEN_US) this.#movedUnseen(by, silentUs);
  }

  /** The heading at an edge that was overtaken: from the count before what overtook it. */
  #headAt(moved: number): void {
    const by = moved - this.#movedBefore;
    if (by !== 0) this.#forwardsBefore = by > 0;
    this.#movedBefore = moved;
  }

  #firstCount(raw: number, nowUs: number): void {
    this.#counted = true;
    this.#count = raw;
    this.#moved = raw * this.#direction;
    this.#movedBefore = this.#moved;
    this.#newestUs = nowUs;
    this.#unseen = false;
    this.#speed.restart(nowUs, this.#moved);
    if (this.#seam === null && this.#lap === 0 && !this.#hand) this.declareStart();
  }

  /** Nobody saw when places on the way were passed, so movement begins where it ended. */
  #movedUnseen(by: number, forUs: number): void {
    this.#unseen = false;
    if (by === 0) return;
    this.#travelFrom = this.#travel;
    this.#progressFrom = this.#progress;
    this.#events.push({ kind: 'unseen', movedCm: by * this.#cmPerCount, forUs });
    this.#seam?.unseen(this.#travel);
  }

  #seamEdge(rose: boolean, forwards: boolean, moved: number): void {
    if (!this.#seam?.leads(rose, forwards, moved) || this.#hand) return;
    if (!this.#homed) {
      if (!rose) return;
      const before = this.#progress;
      const travel = this.#seam.first(this.#lap);
      this.#home(travel + this.#moved - moved);
      // The belt came onto the mark by that count at least, so a place at the seam is reached.
      this.#travelFrom = this.#travel - 1;
      this.#progressFrom = Math.max(before, travel - 1);
      return;
    }
    const shift = this.#seam.met(moved + this.#offset, rose);
    if (shift !== 0) this.#shift(shift);
  }

  /** Position becomes known: the belt stands at `travel`. */
  #home(travel: number): void {
    this.#homed = true;
    this.#offset = travel - this.#moved;
    this.#travel = travel;
    this.#wasAt(travel);
    this.#travelFrom = this.#travel;
    this.#progressFrom = this.#progress;
  }

  #wasAt(travel: number): void {
    if (travel > this.#progress) this.#progress = travel;
  }

  /** Corrects travel without movement: what is jumped over is missed, nothing comes up twice. */
  #shift(counts: number): void {
    this.#offset += counts;
    this.#travelFrom += counts;
    this.#travel += counts;
    if (this.#travelFrom > this.#progressFrom) this.#progressFrom = this.#travelFrom;
    if (this.#progressFrom > this.#progress) this.#progress = this.#progressFrom;
    this.#wasAt(this.#travel);
  }

  #end(into: Instant): void {
    const nowUs = this.#clock.nowUs;
    const travel = this.#travel;
    const seam = this.#seam;
    if (seam !== null && (travel > seam.missedAbove || travel < seam.missedBelow)) {
      seam.missed(travel);
    }
    const levels = this.#levels;
    if (levels.lick?.contact) levels.lick.checkStuck(nowUs);

    into.nowUs = nowUs;
    into.lapCounts = this.lapCounts;
    into.lapBegan = false;
    if (this.#homed && this.#progress >= (this.#lap + 1) * this.lapCounts) this.#newLap(into);
    if (this.#homed && !this.#placed && this.#lap > 0) this.#place();
    into.trust = seam === null ? this.#start.trust : seam.trust;
    into.placed = this.#placed;
    into.lap = this.#lap;
    into.travelFrom = this.#travelFrom;
    into.travelTo = travel;
    into.progressFrom = this.#progressFrom;
    into.progressTo = this.#progress;
    if (this.#placed) this.#scale.locate(travel, into);
    else into.positionCm = Number.NaN;
    const { io } = this.#speed;
    io[0] = nowUs;
    io[1] = this.#moved;
    this.#speed.take();
    into.speedCmPerS = io[2]! * this.#cmPerCount * 1_000_000;
    into.lick = levels.licked;
    into.inputs = levels.inputs;
    into.rose = levels.rose;
    into.fell = levels.fell;
    if (this.#events.length > 0) this.#flush();
  }

  #newLap(into: Instant): void {
    this.#lap = Math.floor(this.#progress / this.lapCounts);
    into.lapBegan = true;
    this.#events.push({ kind: 'lap began', lap: this.#lap });
  }

  /** The lap before the first is no lap: nothing in it is reached as lap 1 begins. */
  #place(): void {
    this.#placed = true;
    const least = this.#lap * this.lapCounts - 1;
    if (this.#travelFrom < least) this.#travelFrom = least;
    if (this.#progressFrom < least) this.#progressFrom = least;
  }

  #flush(): void {
    for (const event of this.#events) this.#listener?.tracked(event);
    this.#events.length = 0;
  }
}
