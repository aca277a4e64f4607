/** What the rules editor is told; types only, for the page. */
import type { RunsReport } from '../../rehearse/runsReport.js';

/** Where something stands: in the text being edited, or in a file that it brings in. */
export interface TextPlace {
  /** Below the rules folder. */
  readonly path: string;
  /** True in the text being edited: then `from` and `to` are offsets in it. */
  readonly here: boolean;
  /** From 1; columns in UTF-16 units. */
  readonly line: number;
  readonly column: number;
  readonly from: number;
  readonly to: number;
}

export interface RulesProblem extends TextPlace {
  readonly severity: 'error' | 'warning';
  /** One of those in server/rules/RULES.md. */
  readonly code: string;
  readonly message: string;
  readonly expected?: string;
  readonly nearest?: string;
  readonly also: readonly (TextPlace & { readonly note: string })[];
}

/** A stretch of the belt, cm; over the seam when `fromCm` is the greater. */
export interface BeltStretch {
  readonly fromCm: number;
  readonly toCm: number;
  /** `somewhere`: one point, drawn or chosen, between the two. */
  readonly kind: 'point' | 'span' | 'somewhere';
}

export interface Outlined {
  readonly name: string;
  readonly line: number;
  readonly from: number;
  readonly to: number;
  /** Of a rule its moment and actions, of a phase its course, of a draw its choices: in words. */
  readonly words: string;
  readonly spots: readonly BeltStretch[];
}

export interface RulesOutline {
  readonly title: string;
  readonly beltCm: number;
  readonly places: readonly Outlined[];
  readonly rules: readonly Outlined[];
  readonly phases: readonly Outlined[];
}

export interface CheckAnswer {
  /** There is no error: it may be rehearsed. */
  readonly right: boolean;
  readonly problems: readonly RulesProblem[];
  /** Of what could be read; null when nothing could. */
  readonly outline: RulesOutline | null;
  /** In plain words what the file will do; empty while there is an error. */
  readonly explain: string;
}

export interface RulesFileAnswer {
  readonly path: string;
  readonly text: string;
  readonly version: string;
}

export interface RulesListAnswer {
  readonly files: readonly string[];
  readonly rig: RigNames;
}

/** Names that a rules file may use for this rig. */
export interface RigNames {
  readonly beltCm: number;
  readonly outputs: readonly { readonly name: string; readonly kind: string }[];
  readonly inputs: readonly string[];
}

/** Laps by number, with what happened in each: pairs of place (mm) and kind, in order. */
export interface RasterLap {
  readonly lap: number;
  readonly mm: readonly number[];
  /** One of the page's kinds of mark (dashboard/model/laps.ts). */
  readonly kinds: readonly RasterKind[];
}
export type RasterKind =
  | 'lick'
  | 'artefact'
  | 'water'
  | 'stimulus'
  | 'sham'
  | 'missed'
  | 'withheld';

export interface RehearsedRule {
  readonly name: string;
  readonly fired: number;
  readonly shams: number;
  readonly not: readonly { readonly why: string; readonly times: number }[];
  /** Distance from the place intended, mm; null where nothing fired at a place. */
  readonly medianErrorMm: number | null;
  readonly worstErrorMm: number | null;
}

export interface RehearsalResult {
  readonly seed: string;
  readonly sessionS: number;
  readonly laps: number;
  readonly licks: number;
  readonly waterUl: number;
  readonly endedBecause: string;
  /** How long it took, seconds of real time. */
  readonly tookS: number;
  readonly rules: readonly RehearsedRule[];
  readonly phases: readonly { readonly name: string; readonly lap: number; readonly s: number }[];
  readonly beltCm: number;
  readonly raster: readonly RasterLap[];
  /** Marks beyond those that are kept. */
  readonly marksLeftOut: number;
}

/** How many sessions differ. */
export interface ManyResult {
  readonly report: RunsReport;
  /** How long it took, seconds of real time. */
  readonly tookS: number;
}

export type RehearsalState =
  | { readonly state: 'none' }
  | {
      readonly state: 'running';
      readonly number: number;
      readonly sessionS: number;
      readonly mostS: number;
      /** Of many sessions: how many there are to be, and how many there are. */
      readonly runs: number;
      readonly runsDone: number;
    }
  | {
      readonly state: 'failed';
      readonly number: number;
      readonly code: string;
      readonly detail: string;
      readonly remedy: string;
    }
  | { readonly state: 'cancelled'; readonly number: number }
  | { readonly state: 'done'; readonly number: number; readonly result: RehearsalResult }
  | { readonly state: 'many done'; readonly number: number; readonly result: ManyResult };
