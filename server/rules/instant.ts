/**
 * The contract between the rules engine and what surrounds it: what one instant shows the engine,
 * and what the engine asks in return. Both sides reuse these objects from frame to frame.
 *
 * Belt coordinates: `travelCounts` is the belt unrolled, in counts; lap n begins at
 * `n * lapCounts`, and the seam mark's corrections are already in it.
 */

import type { FieldPrediction } from '../plasticity/fieldPrediction.js';

export type Trust = 'unknown' | 'trusted' | 'doubtful';

/** What is known at one instant; filled by the tracker and the session before the engine runs. */
export interface Instant {
  /** Extended board time, microseconds. */
  nowUs: number;
  trust: Trust;
  /** Position is known: lap 1 has begun. */
  placed: boolean;
  lapCounts: number;
  /** Where movement in this instant began (after any seam correction) and where it ended. */
  travelFrom: number;
  travelTo: number;
  /** The furthest travel so far, before and after this instant's movement. */
  progressFrom: number;
  progressTo: number;
  /** Position along the belt, [0, length). NaN while not placed. */
  positionCm: number;
  /** Signed, over the rig's window. */
  speedCmPerS: number;
  lap: number;
  /** This instant began lap `lap`. */
  lapBegan: boolean;
  /** A debounced lick began at this instant. */
  lick: boolean;
  /** Input levels, bit n for input n, and which rose or fell at this instant. */
  inputs: number;
  rose: number;
  fell: number;
}

/** One output's part in a firing, with every amount already reckoned. */
export interface OutputOrder {
  readonly output: number;
  /** For a valve: the volume; else 0. */
  readonly volumeNl: number;
  readonly widthUs: number;
  /** Rise to rise; 0 with one repeat. */
  readonly periodUs: number;
  readonly repeats: number;
  /** A hold or an open-ended train: the engine will stop it when its `while` ends. */
  readonly stoppable: boolean;
  /** Delay after the moment; 0 is now. */
  readonly delayUs: number;
}

/** One firing that a rule asks for, all of its outputs together. */
export interface FiringRequest {
  readonly rule: number;
  /** Which asking of this rule this is, from 1: names the firing in the record. */
  readonly serial: number;
  /** Board time of the moment, and the last time at which a first rise is still right. */
  readonly causeUs: number;
  readonly expiryUs: number;
  /** The place intended, in travel counts, and how far from it a rise is right; NaN without one. */
  readonly placeTravel: number;
  readonly withinCounts: number;
  readonly sham: boolean;
  readonly orders: readonly OutputOrder[];
}

/** A place ahead of the animal at which the board may start a firing by itself. */
export interface ArmRequest extends FiringRequest {
  /** Fires as travel rises to the place (forwards), or falls to it. */
  readonly forwards: boolean;
}

/** Undefined: agreed. Otherwise why the guard said no, in the record's words. */
export type Withheld = string | undefined;

/** What the engine asks of the session; answers come back through `RulesEngine.settle`. */
export interface Actuator {
  /** Guards the orders and sends them; a sham is guarded the same and sends nothing. */
  fire(request: FiringRequest): Withheld;
  /**
   * Wants a slot armed with this firing from now on; asked again each instant it is still wanted,
   * and ended by `disarm`. Undefined once armed or on its way; otherwise why not.
   */
  arm(request: ArmRequest): Withheld;
  /** The rule no longer wants its slot; its outcome still arrives by `settle`. */
  disarm(rule: number): void;
  /** Ends what the output does now. */
  stop(output: number): void;
  endSession(reason: string): void;
}

/** Told to the record; never read back by the engine. */
export interface Journal {
  fired(rule: number, serial: number, sham: boolean, armed: boolean): void;
  withheld(rule: number, serial: number, reason: string): void;
  missed(rule: number, serial: number, reason: string): void;
  drawn(draw: string, scope: string, index: number, value: number | string): void;
  phaseBegan(phase: string, index: number, reason: string): void;
  cellBegan(index: number): void;
  noted(rule: number, serial: number): void;
  /** An operator's choice counts from now on. */
  chosen(choice: number, value: number | string): void;
  /** The session will end by itself: laps left (NaN: no pace known), time left (NaN: not by time). */
  endForeseen(laps: number, us: number, exact: boolean, what: string): void;
  /** @param curve over the belt in even bins, as a share of its peak */
  fieldPredicted(
    rule: number,
    serial: number,
    field: FieldPrediction,
    curve: readonly number[],
  ): void;
}
/**
 * Told, where someone asks, of moments at which a rule was not even tried; never read back by the
 * engine, and no part of a record. Bit n of `untrue` and `unknown` is the nth term of its `if`.
 */
export interface Inquiry {
  ifFailed(rule: number, untrue: number, unknown: number): void;
  chanceFailed(rule: number): void;
  /** The nth limit of the rule left no room. */
  limitMet(rule: number, limit: number): void;
  /** The rules end the session; bit n: the nth alternative of `end` is true. */
  ended(alternatives: number): void;
}
/** How a firing that was asked or armed ended. */
export type Settlement =
  | 'fired'
  /** The board refused every output of it, or it came too late or too far: no firing. */
  | 'not fired'
  /** Never accounted for: stays charged. */
  | 'uncertain';
