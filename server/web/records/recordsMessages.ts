/** What the Records page is told, and what it may ask for. Amounts in uL, cm, mm, seconds. */
import type { LearningDay } from '../../analysis/learning.js';
import type { SessionDescription, SessionEnd } from '../../session/description.js';
import type { Difference } from '../../session/replay.js';
import type { FiringCompared, WhatIf } from '../../session/whatIf.js';

/** One session folder in the list: what its description says, or why it says nothing. */
export interface SessionRow {
  /** The folder's name, by which everything else asks for it. */
  readonly name: string;
  /** Why the description cannot be read; then most of what follows is empty. */
  readonly bad: string | null;
  readonly subject: string;
  readonly title: string;
  readonly experimenter: string | null;
  readonly protocolNumber: string | null;
  readonly sessionNumber: number | null;
  /** RFC 3339 with the zone's offset; of a bad description, from the folder's name, or empty. */
  readonly startedAt: string;
  /** The rules file's own name, where it came from. */
  readonly rules: string;
  /** A living process writes its record now. */
  readonly recording: boolean;
  readonly ended: SessionEnd | null;
  readonly minutes: number | null;
  readonly givenUl: number | null;
  readonly uncertainUl: number | null;
  /** What the record was found to be when it was finished; null where it was not. */
  readonly record: 'whole' | 'open' | 'torn' | 'damaged' | null;
  /** The self-check: whether a replay made the same decisions. */
  readonly check: 'identical' | 'different' | 'failed' | null;
  readonly simulated: boolean | null;
}

export type SessionSort = 'started' | 'subject' | 'title' | 'minutes' | 'water';
/** `trouble`: left unfinished, a record that is not whole, a self-check not passed, a bad description. */
export type SessionState = 'any' | 'ended' | 'recording' | 'trouble';

/** A session is found when it fits all that is given. */
export interface SessionQuery {
  /** Words that must all stand somewhere in its description. */
  readonly text?: string;
  readonly subject?: string;
  readonly title?: string;
  readonly rules?: string;
  /** Days, `2026-03-04`, in the zone of the recording; both included. */
  readonly from?: string;
  readonly to?: string;
  readonly state?: SessionState;
  readonly sort?: SessionSort;
  readonly order?: 'up' | 'down';
  readonly offset?: number;
  readonly limit?: number;
}

export interface SessionList {
  /** Sessions there are, and those that fit. */
  readonly total: number;
  readonly found: number;
  readonly rows: readonly SessionRow[];
  /** Over all sessions: the subject seen last comes first. */
  readonly subjects: readonly { readonly subject: string; readonly sessions: number }[];
  readonly rules: readonly string[];
}

export const EXPORTS = ['tables', 'parquet', 'nwb'] as const;
export type ExportFormat = (typeof EXPORTS)[number];
/** What can be downloaded as one file. */
export type Download = 'session' | 'report' | ExportFormat;

/** Something made from the record, lying in the session's `derived`. */
export interface Made {
  readonly bytes: number;
  /** RFC 3339. */
  readonly at: string;
  /** The record or the description was changed since. */
  readonly old: boolean;
}

export interface SessionTold {
  readonly row: SessionRow;
  readonly description: SessionDescription | null;
  /** Size of the record's own files. */
  readonly recordBytes: number;
  readonly made: { readonly [what in 'report' | ExportFormat]: Made | null };
  readonly summary: SummaryTold | null;
}

/** Distances of firings from their places, mm. */
export interface ErrorsTold {
  readonly firings: number;
  readonly medianMm: number;
  readonly worstMm: number;
}
export interface RuleTold {
  readonly name: string;
  readonly fired: number;
  readonly shams: number;
  readonly not: readonly { readonly why: string; readonly times: number }[];
  /** Started by the board, and decided in the host. */
  readonly armed: ErrorsTold | null;
  readonly host: ErrorsTold | null;
}
export interface FiringTold {
  readonly timeS: number;
  readonly lap: number;
  readonly rule: string;
  readonly output: string | null;
  /** Where the output rose, and the place it was meant for. */
  readonly atCm: number | null;
  readonly placeCm: number | null;
  readonly errorMm: number | null;
  readonly sham: boolean;
  readonly armed: boolean;
}
/** What the record says happened, from its decisions alone. */
export interface SummaryTold {
  readonly minutes: number;
  readonly laps: number;
  readonly licks: number;
  readonly waterUl: number;
  readonly rules: readonly RuleTold[];
  readonly firings: readonly FiringTold[];
  readonly firingsLeftOut: number;
  readonly notes: readonly { readonly timeS: number; readonly text: string }[];
}

/** What is asked for about one session; it becomes a job. */
export type Work =
  | { readonly do: 'summary' | 'report' | 'replay' | 'mend' }
  | { readonly do: 'export'; readonly to: ExportFormat }
  /** `rules`: a path below the rules folder. */
  | { readonly do: 'what if'; readonly rules: string };

export interface ReplayTold {
  readonly inputs: number;
  readonly decisions: number;
  readonly commands: number;
  readonly difference: Difference | null;
  /** A sentence for each thing that the record lacks. */
  readonly missing: readonly string[];
}
export interface WhatIfTold {
  readonly rules: string;
  readonly title: string;
  readonly counts: WhatIf['counts'];
  readonly rows: readonly FiringCompared[];
  readonly rowsLeftOut: number;
}
export interface MendTold {
  readonly messages: number;
  readonly lastInput: number;
  readonly bytes: number;
  readonly missing: readonly string[];
  /** Of the self-check that follows; null where there is nothing to replay. */
  readonly identical: boolean | null;
}
/** Numbers that cannot be had (no lick, no lap) are null on their way through JSON. */
type Told<T> = T extends number
  ? number | null
  : T extends object
    ? { [K in keyof T]: Told<T[K]> }
    : T;
export type DayTold = Told<LearningDay>;
export interface LearningTold {
  readonly days: readonly DayTold[];
}
