/**
 * What the loop and its local clients (the web process, the command line) say to each other: one
 * JSON object a line over a Unix socket (a named pipe on Windows).
 *
 * `hello`, `quiet` and `end` never change across versions, so that an old client can always stop a
 * new loop.
 */

import type { EngineView } from '../rules/engine/view.js';
import type { Trust } from '../rules/instant.js';
import type { MarkMade } from '../session/core/marks.js';
import type { StampedDecision } from '../session/decisions.js';
import type { OperatorAct } from '../session/inputs.js';
import type { AlarmView } from './alarms/alarms.js';

export const LOCAL_PROTOCOL = 1;

/** Who asks and from where, of a client that speaks for several people. */
export interface AskedBy {
  readonly who?: string;
  readonly from?: string;
}

/**
 * Client to loop. Every request may carry a number that the answer repeats, and when it was said
 * (milliseconds since 1970, the same machine): a loop that was stopped refuses what it reads too
 * late, but for `quiet` and `end`.
 */
export type ClientMessage = { readonly request?: number; readonly saidMs?: number } & (
  | { readonly say: 'hello'; readonly token: string; readonly client: string }
  | ({ readonly say: 'quiet' } & AskedBy)
  | ({ readonly say: 'end'; readonly reason: string } & AskedBy)
  /** Begin sending state (latest only, at most `hz` times a second) and events after `after`. */
  | { readonly say: 'watch'; readonly hz: number; readonly after: number }
  | {
      readonly say: 'begin';
      /** A path below the rules folder. */
      readonly rules: string;
      readonly subject: string;
      readonly experimenter?: string;
      readonly protocolNumber?: string;
      /** Counted on from the subject's last where nothing is said. */
      readonly sessionNumber?: number;
      readonly seed?: string;
      /** Why it is to begin whatever the animals folder or the pre-flight has against it. */
      readonly despite?: string;
    }
  | { readonly say: 'act'; readonly act: OperatorAct; readonly who: string; readonly from: string }
  /** Raw edges from now on, or no longer; `frames` times every frame as well. */
  | { readonly say: 'bench'; readonly on: boolean; readonly frames?: boolean }
  /** One pulse of one output, between sessions only, by a client that watches the bench. */
  | ({ readonly say: 'try' } & TryRequest)
  /** The rig file has changed: read it again, between sessions only. */
  | { readonly say: 'reload' }
);

/** Loop to client. */
export type LoopMessage =
  | {
      readonly tell: 'hello';
      readonly protocol: number;
      readonly version: string;
      readonly rig: string;
    }
  | { readonly tell: 'done'; readonly request: number; readonly result?: unknown }
  | { readonly tell: 'bench'; readonly now: BenchNow; readonly items: readonly BenchItem[] }
  | {
      readonly tell: 'error';
      readonly request?: number;
      readonly code: string;
      readonly message: string;
      readonly remedy: string;
    }
  | { readonly tell: 'setup'; readonly setup: Setup }
  | { readonly tell: 'state'; readonly state: Snapshot }
  | { readonly tell: 'events'; readonly events: readonly NumberedEvent[] }
  /** The client fell behind: events `from` to `to` are in the record and not sent. */
  | { readonly tell: 'gap'; readonly from: number; readonly to: number };

export interface TryRequest {
  /** By its name in the rig file. */
  readonly output: string;
  readonly widthUs: number;
  /** Where a valve's water goes: a vial has none of the limits of an animal's water. */
  readonly into: 'vial' | 'spout';
}

/** What became of a pulse that was tried. */
export interface Tried {
  readonly output: string;
  /** Extended board time of the rise; null where only the fall was told. */
  readonly riseUs: number | null;
  /** As the board measured it. */
  readonly onUs: number;
  readonly volumeNl: number;
  /** From the command's write to the board's word of the rise, by the computer's clock. */
  readonly roundTripUs: number | null;
}

/** What the bench shows, in board time; lines are the board's numbers. */
export type BenchItem =
  | {
      readonly is: 'edge';
      readonly atUs: number;
      /** The encoder's count, 32 bits signed. */
      readonly count: number;
      readonly line: number;
      readonly level: 0 | 1;
    }
  | { readonly is: 'output'; readonly atUs: number; readonly line: number; readonly on: boolean }
  /** Board and host time of frames by turns, microseconds. */
  | { readonly is: 'frames'; readonly us: readonly number[] };

export interface BenchNow {
  readonly atUs: number;
  readonly count: number;
  /** The board that answered; null before one has. */
  readonly board: {
    readonly model: string;
    readonly boardId: number;
    readonly firmware: number;
    readonly simulated: boolean;
  } | null;
}

export interface NumberedEvent {
  readonly number: number;
  readonly event: StampedDecision;
}

/** What stays the same while a session runs (or the loop is idle). */
export interface Setup {
  readonly rig: string;
  readonly simulated: boolean;
  readonly beltLengthCm: number;
  readonly outputs: readonly {
    readonly name: string;
    readonly kind: 'valve' | 'stimulus' | 'mark';
  }[];
  readonly inputs: readonly string[];
  /** What the rig file asks for at each new cell. */
  readonly cellFields: readonly string[];
  /** Inputs that are buttons, and what they do. */
  readonly buttonBox: readonly { readonly input: string; readonly does: string }[];
  /** Rules files that can be begun, as paths below the rules folder. */
  readonly rulesFiles: readonly string[];
  readonly session: null | {
    readonly folder: string;
    readonly title: string;
    readonly subject: string;
    readonly experimenter: string;
    readonly seed: string;
    readonly startedAt: string;
    readonly rulesText: string;
    /** Its arm is sealed: what would show it is hidden. */
    readonly blinded: boolean;
    readonly rules: readonly string[];
    readonly phases: readonly string[];
    readonly buttons: readonly string[];
    /** Rules that drive a stimulus. */
    readonly stimuli: readonly string[];
    /** What may be asked for: at once, and in so many of the next laps at most (0: not). */
    readonly asks: readonly {
      readonly rule: string;
      readonly now: boolean;
      readonly laps: number;
    }[];
    readonly choices: readonly {
      readonly name: string;
      readonly unit: string;
      readonly least?: number;
      readonly most?: number;
      readonly step?: number;
      readonly options?: readonly (number | string)[];
    }[];
  };
}

/** The state now, at most 50 times a second; a client that is slow sees only the latest. */
export interface Snapshot {
  /** The last engine input. */
  readonly input: number;
  /** Extended board time, microseconds; the page calls itself stale when it stops moving. */
  readonly boardUs: number;
  readonly session: 'idle' | 'running' | 'ended';
  readonly endedBecause: string | null;
  readonly sessionS: number;
  readonly link: {
    readonly state: 'up' | 'connecting' | 'down';
    readonly reason: string;
    readonly remedy: string;
    readonly port: string;
    readonly board: string;
    readonly framesPerS: number;
    readonly lostFrames: number;
    readonly badFrames: number;
  };
  readonly trust: Trust;
  readonly trustReason: string;
  readonly positionCm: number | null;
  readonly speedCmPerS: number;
  readonly lap: number;
  readonly lickOn: boolean;
  readonly licks: number;
  readonly phase: string | null;
  readonly phaseLap: number;
  readonly progress: EngineView['progress'];
  readonly cell: number;
  /** The end, as far as it can be foreseen, and by how much it was put off. */
  readonly end: EngineView['end'];
  readonly putOff: EngineView['putOff'];
  readonly places: EngineView['places'];
  readonly choices: readonly (EngineView['choices'][number] & {
    /** A change is in force and the board has yet to be armed by it. */
    readonly waits: boolean;
  })[];
  readonly rules: EngineView['rules'];
  /** Bit n for output n. */
  readonly outputs: number;
  readonly inputs: number;
  readonly waterUl: number;
  /** Of drops never accounted for. */
  readonly waterUncertainUl: number;
  readonly waterLimitUl: number;
  readonly waterTodayUl: number;
  readonly waterDayLimitUl: number;
  readonly alarms: readonly AlarmView[];
  /** Marks without words, oldest first. */
  readonly marks: readonly MarkMade[];
  readonly held: { readonly stimulus: string | null; readonly water: string | null };
  /** A hand turns the belt: nothing counts. */
  readonly handOnBelt: boolean;
  readonly record: {
    readonly state: 'off' | 'writing' | 'failed';
    readonly bytes: number;
    readonly reason: string;
    readonly diskFreeGb: number;
  };
}
