import type { Dimension } from '../ast.js';
import type { RigFacts } from '../facts.js';
import type { Sealed } from '../sealed.js';
import type { State } from './state.js';
import type { TallySpec } from './tally.js';
import type { Truth } from './truth.js';

export { compile } from './compile.js';

/** A rules file turned into closures and tables of who waits for what: made once, by `compile`. */

/** An amount at this instant, in base units; NaN when unknown, Infinity for never. */
export type Amount = (s: State) => number;
export type Test = (s: State) => Truth;

export interface SpanSpec {
  readonly from: Amount;
  readonly to: Amount;
  /** Reads a measure, so that it may move at any instant. */
  readonly moving: boolean;
  /** Its crossings matter; otherwise only whether the animal is in it. */
  tracked: boolean;
  readonly enterRules: number[];
  readonly leaveRules: number[];
  readonly enterMarks: number[];
  readonly leaveMarks: number[];
  readonly visitDraws: number[];
  readonly visitTallies: number[];
  readonly visitNths: number[];
}

export interface PointSpec {
  readonly place: Amount;
  readonly moving: boolean;
  readonly rules: number[];
  readonly marks: number[];
}

/** A rule waiting for licks: every one, the nth of a stretch, or a bout. */
export interface LickWaiter {
  readonly rule: number;
  /** -1: anywhere. */
  readonly span: number;
  readonly nth?: { readonly nth: number; readonly tally: number; readonly stretch: Stretched };
  readonly bout?: { readonly count: Amount; readonly timeUs: Amount; readonly most: number };
}
export type Stretched = 'visit' | 'lap' | 'phase' | 'cell' | 'session';

export interface ValueSpec {
  readonly amount: Amount;
  /** The option it stands for when it is a word, else ''. */
  readonly word: string;
}

export interface DrawSpec {
  readonly name: string;
  readonly dimension: Dimension;
  readonly options: readonly ValueSpec[];
  readonly weights: readonly number[];
  /** A number between bounds: `from + k * numerator / denominator`. */
  readonly between?: {
    readonly from: Amount;
    readonly to: Amount;
    readonly numerator: Amount;
    readonly denominator: number;
  };
  readonly blockSize: number;
  readonly mostInARow: number;
  readonly apart: Amount | undefined;
  readonly every: 'lap' | 'phase' | 'cell' | 'session' | 'visit' | 'firing';
}

export interface ChoiceSpec {
  readonly name: string;
  readonly dimension: Dimension;
  readonly options: readonly ValueSpec[];
  readonly between?: { readonly from: Amount; readonly to: Amount };
  readonly first: { readonly value: number; readonly option: number };
  /** A choice between bounds goes in steps from the lower one. */
  readonly step: Amount | undefined;
  /** A place depends on it: a change waits for the next lap. */
  readonly movesPlace: boolean;
  /** Rules that the board may start and that depend on it: a change arms them anew. */
  readonly rearms: readonly number[];
}

export interface PhaseSpec {
  readonly name: string;
  /** Undefined: to the end. */
  readonly over: Test | undefined;
  readonly atLapEnd: boolean;
  readonly why: string;
  /** How far it is from being over; undefined where that cannot be told. */
  readonly ahead: Ahead | undefined;
}

/** What is still lacking until one comparison comes true. */
export interface GapSpec {
  /** Not more than 0 once it is true. */
  readonly lacking: Amount;
  /** Laps are foreseen exactly; time by the pace of the laps; the rest by what a lap brings. */
  readonly unit: 'laps' | 'time' | 'other';
  /** For people: how far it has come, of how much, and what is counted. */
  readonly done: Amount;
  readonly goal: Amount;
  readonly dimension: Dimension;
  readonly what: string;
}
/** A condition as the gaps that are left to it; a test stands for what cannot be foreseen. */
export type Ahead =
  | { readonly kind: 'gap'; readonly gap: number }
  | { readonly kind: 'test'; readonly test: Test }
  | { readonly kind: 'all' | 'any'; readonly of: readonly Ahead[] };

export type ActionSpec =
  | {
      readonly kind: 'order';
      readonly delayUs: Amount | undefined;
      readonly output: number;
      readonly outputKind: 'valve' | 'stimulus' | 'mark';
      readonly volumeNl: Amount | undefined;
      readonly widthUs: Amount;
      readonly periodUs: Amount | undefined;
      readonly repeats: Amount | undefined;
      /** `up to` of a train, from which its repeats follow. */
      readonly upToUs: Amount | undefined;
      readonly during: Test | undefined;
    }
  | { readonly kind: 'stop'; readonly delayUs: Amount | undefined; readonly output: number }
  | { readonly kind: 'note' | 'next phase' | 'end session'; readonly delayUs: Amount | undefined }
  | { readonly kind: 'go to'; readonly delayUs: Amount | undefined; readonly phase: number };

export type CapSpec =
  | { readonly kind: 'lap' | 'phase' | 'cell' | 'session'; readonly count: Amount }
  | { readonly kind: 'window'; readonly count: Amount; readonly timeUs: Amount }
  | { readonly kind: 'apart time'; readonly timeUs: Amount }
  | { readonly kind: 'apart laps'; readonly laps: Amount };

export interface RuleSpec {
  readonly name: string;
  readonly index: number;
  readonly when:
    | { readonly kind: 'moment' }
    | { readonly kind: 'after'; readonly delayUs: Amount }
    | { readonly kind: 'every'; readonly intervalUs: Amount }
    | { readonly kind: 'times'; readonly timeUs: readonly number[] }
    | {
        readonly kind: 'places';
        readonly lap: readonly number[];
        readonly placeCm: readonly number[];
      }
    | {
        readonly kind: 'becomes';
        readonly condition: Test;
        readonly lastingUs: Amount | undefined;
      };
  readonly if: Test | undefined;
  /** What `and` joins in it; itself alone where it is no `and`. For whoever asks why. */
  readonly ifTerms: readonly Test[];
  /** 0 to 1; undefined: always. */
  readonly chance: number | undefined;
  readonly sham: Test | undefined;
  readonly actions: readonly ActionSpec[];
  /** Some amount of its actions reads a measure, so that it may differ at any instant. */
  readonly amountsVary: boolean;
  readonly caps: readonly CapSpec[];
  /** Tallies of its real and of its sham firings. */
  /** Each real firing is taken to induce a field, which is predicted. */
  readonly induces: boolean;
  readonly realTally: number;
  readonly shamTally: number;
  readonly withinUs: Amount | undefined;
  readonly withinCm: Amount | undefined;
  /** Names or reads a place: then water needs a known position, stimuli a trusted one. */
  readonly tiedToPlace: boolean;
  /** May be started by the board: the place it waits for, else undefined. */
  readonly arming: Arming | undefined;
  /** What the operator may ask of it: at once, and in so many of the next laps at most. */
  readonly asked: { readonly now: boolean; readonly laps: Amount | undefined } | undefined;
  /** The most laps that may be asked for, whatever a choice in it is set to. */
  readonly mostAsked: number;
  /** Rules that wait for this one to fire, marks that read it, draws that it renews. */
  readonly firesRules: number[];
  readonly firesDraws: number[];
}

export type Arming =
  | { readonly kind: 'reaches'; readonly point: number }
  | { readonly kind: 'enters' | 'leaves'; readonly span: number };

export interface PlaceView {
  readonly name: string;
  readonly from: Amount;
  readonly to: Amount;
}

export interface Program {
  /** What is hidden while an allocation is sealed. */
  readonly sealed: Sealed | undefined;
  readonly title: string;
  readonly facts: RigFacts;
  readonly rules: readonly RuleSpec[];
  readonly phases: readonly PhaseSpec[];
  readonly draws: readonly DrawSpec[];
  readonly choices: readonly ChoiceSpec[];
  readonly spans: readonly SpanSpec[];
  readonly points: readonly PointSpec[];
  readonly tallies: readonly TallySpec[];
  readonly marks: number;
  readonly places: readonly PlaceView[];
  readonly end: Test | undefined;
  /** What `or` joins in it; for whoever asks why a session ended. */
  readonly endAlternatives: readonly Test[];
  readonly endAhead: Ahead | undefined;
  readonly gaps: readonly GapSpec[];

  readonly lickWaiters: readonly LickWaiter[];
  readonly lickMarks: readonly { readonly span: number; readonly mark: number }[];
  readonly risesRules: readonly { readonly input: number; readonly rule: number }[];
  readonly fallsRules: readonly { readonly input: number; readonly rule: number }[];
  readonly inputMarks: readonly {
    readonly input: number;
    readonly rises: boolean;
    readonly mark: number;
  }[];
  readonly lapRules: readonly number[];
  readonly cellRules: readonly number[];
  readonly sessionRules: readonly number[];
  readonly phaseRules: readonly { readonly phase: number; readonly rule: number }[];
  readonly phaseMarks: readonly { readonly phase: number; readonly mark: number }[];
  /** Names of the buttons that rules wait for, and the rules of each. */
  readonly buttons: readonly string[];
  readonly buttonRules: readonly (readonly number[])[];
}
