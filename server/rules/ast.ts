/**
 * The syntax tree of a rules file: what the parser makes, the checker proves, the printer prints
 * and the compiler turns into closures. Every node keeps where it stood.
 */

/** Offsets into the text of one source file; `file` indexes `RulesFile.sources`. */
export interface SourceSpan {
  readonly file: number;
  readonly start: number;
  readonly end: number;
}
export interface Located {
  readonly at: SourceSpan;
}
export interface Source {
  readonly path: string;
  readonly text: string;
}

/** Kinds of amount. A ratio of like amounts, a count and a percentage are numbers. */
export type Dimension = 'number' | 'length' | 'time' | 'speed' | 'volume' | 'rate';

/** Base units that the engine reckons in. */
export const BASE_UNIT: Readonly<Record<Dimension, string>> = {
  number: '',
  length: 'cm',
  time: 'us',
  speed: 'cm/s',
  volume: 'nL',
  rate: 'Hz',
};

export interface NameRef extends Located {
  readonly name: string;
}

/** A number with the unit as written; `value` is in base units, `written` as it stood. */
export interface Quantity extends Located {
  readonly kind: 'quantity';
  readonly value: number;
  readonly dimension: Dimension;
  readonly written: string;
}

// ---- amounts -------------------------------------------------------------------------------

export type Sum =
  | Quantity
  | (NameRef & { readonly kind: 'name' })
  | (Located & { readonly kind: 'edge'; readonly edge: 'start' | 'end'; readonly of: NameRef })
  | (Located & { readonly kind: 'negate'; readonly of: Sum })
  | (Located & {
      readonly kind: 'binary';
      readonly operator: '+' | '-' | '*' | '/';
      readonly left: Sum;
      readonly right: Sum;
    })
  | Measure;

export type Stretch = 'visit' | 'lap' | 'phase' | 'cell' | 'session';
export type Scope =
  | (Located & { readonly kind: 'this'; readonly stretch: Stretch })
  | (Located & { readonly kind: 'last laps'; readonly count: Sum })
  | (Located & { readonly kind: 'last time'; readonly time: Sum });

/** A span named, or given by its two edges (over the seam when the first is the greater). */
export type SpanExpr =
  | (NameRef & { readonly kind: 'name' })
  | (Located & { readonly kind: 'range'; readonly from: Sum; readonly to: Sum });

export type Measure =
  | (Located & {
      readonly kind: 'measure';
      readonly measure:
        | 'position'
        | 'speed'
        | 'lap'
        | 'phase lap'
        | 'time'
        | 'phase time'
        | 'lap time';
    })
  | (Located & {
      readonly kind: 'scoped';
      readonly measure: 'licks' | 'share of licks' | 'mean speed' | 'water given' | 'laps done';
      readonly within?: SpanExpr;
      readonly scope: Scope;
    })
  | (Located & {
      readonly kind: 'firings';
      readonly of: NameRef;
      readonly which: 'all' | 'real' | 'sham';
      readonly scope: Scope;
    })
  | (Located & {
      readonly kind: 'since';
      readonly unit: 'time' | 'laps';
      readonly mark: Mark;
    })
  /** Of the field that the rule's last firing is predicted to leave. */
  | (Located & {
      readonly kind: 'predicted';
      readonly what: PredictedAmount;
      readonly of: NameRef;
    });
export type PredictedAmount = 'width' | 'centre' | 'shift' | 'asymmetry';

export type Mark =
  | (Located & {
      readonly kind: 'name mark';
      readonly name: NameRef;
      readonly event: 'fires' | 'rises' | 'falls' | 'begins';
    })
  | (Located & { readonly kind: 'lick mark'; readonly within?: NameRef })
  | (Located & {
      readonly kind: 'place mark';
      readonly event: 'reaches' | 'enters' | 'leaves';
      readonly place: NameRef;
    });

// ---- conditions ----------------------------------------------------------------------------

export type Condition =
  | (Located & { readonly kind: 'and' | 'or'; readonly terms: readonly Condition[] })
  | (Located & { readonly kind: 'not'; readonly of: Condition })
  | (Located & { readonly kind: 'in'; readonly span: SpanExpr })
  | (Located & { readonly kind: 'still' })
  /** The criterion of `learned.ts` is met for a span. */
  | (Located & { readonly kind: 'learned'; readonly span: SpanExpr })
  | (Located & {
      readonly kind: 'compare';
      readonly operator: '<' | '<=' | '>' | '>=';
      readonly left: Sum;
      readonly right: Sum;
    })
  /** `subject is A or B`; the subject may be the word `phase`. */
  | (Located & {
      readonly kind: 'is';
      readonly subject: Sum | (Located & { readonly kind: 'phase word' });
      readonly negated: boolean;
      readonly options: readonly Option[];
    })
  | (Located & {
      readonly kind: 'is range';
      readonly subject: Sum;
      readonly negated: boolean;
      readonly from: Sum;
      readonly to: Sum;
    })
  | (Located & {
      readonly kind: 'multiple';
      readonly subject: Sum;
      readonly negated: boolean;
      readonly of: Sum;
    });

/** What `and` joins in a condition, at its outermost; the condition itself where it is no `and`. */
export function termsOf(condition: Condition | undefined): readonly Condition[] {
  if (condition === undefined) return [];
  return condition.kind === 'and' ? condition.terms : [condition];
}

/** What `or` joins in a condition, at its outermost; the condition itself where it is no `or`. */
export function alternativesOf(condition: Condition | undefined): readonly Condition[] {
  if (condition === undefined) return [];
  return condition.kind === 'or' ? condition.terms : [condition];
}

/** A choice: an amount, or a word (a phase, a draw's word, `high`, `low`, a place). */
export type Option = Quantity | (NameRef & { readonly kind: 'name' });

// ---- sections ------------------------------------------------------------------------------

/** A value that may differ by phase: `4 uL, but 2 uL in probe`. */
export interface ByPhase<T> {
  readonly base: T;
  readonly exceptions: readonly { readonly value: T; readonly phases: readonly NameRef[] }[];
}

export interface ValueDecl extends Located {
  readonly name: NameRef;
  readonly value: ByPhase<Sum>;
}
/** A point (`to` absent) or a span. */
export interface Spot extends Located {
  readonly from: Sum;
  readonly to?: Sum;
}
export interface PlaceDecl extends Located {
  readonly name: NameRef;
  readonly place: ByPhase<Spot>;
}
export type Choices =
  | (Located & { readonly kind: 'options'; readonly options: readonly Option[] })
  | (Located & { readonly kind: 'between'; readonly from: Sum; readonly to: Sum });
export type Occasion =
  | (Located & { readonly kind: 'lap' | 'phase' | 'cell' | 'session' })
  | (Located & { readonly kind: 'visit'; readonly to: NameRef })
  | (Located & { readonly kind: 'firing'; readonly of: NameRef });
export type Habit =
  | (Located & { readonly kind: 'weighted'; readonly weights: readonly number[] })
  | (Located & { readonly kind: 'blocks'; readonly size: number })
  | (Located & { readonly kind: 'run'; readonly most: number })
  | (Located & { readonly kind: 'apart'; readonly least: Sum })
  | (Located & { readonly kind: 'steps'; readonly of: Sum })
  /** Not drawn here: it is in a sealed allocation, and nobody at the rig may see it. */
  | (Located & { readonly kind: 'sealed' });
export interface DrawDecl extends Located {
  readonly name: NameRef;
  readonly choices: Choices;
  readonly every: Occasion;
  readonly habits: readonly Habit[];
}
export interface OperatorDecl extends Located {
  readonly name: NameRef;
  readonly choices: Choices;
  /** A choice between bounds goes in these steps, counted from the lower bound. */
  readonly step?: Sum;
  readonly first: Option;
}
export interface TableDecl extends Located {
  readonly name: NameRef;
  readonly file: NameRef;
  /** Filled by the loader: `time_s` rows in microseconds, or laps and places in cm. */
  readonly rows: TableRows;
}
export type TableRows =
  | { readonly kind: 'times'; readonly timeUs: readonly number[] }
  | {
      readonly kind: 'places';
      readonly lap: readonly number[];
      readonly placeCm: readonly number[];
    };

export type PhaseLength =
  | (Located & { readonly kind: 'laps'; readonly count: Sum })
  | (Located & { readonly kind: 'time'; readonly time: Sum });
export interface PhaseDecl extends Located {
  readonly name: NameRef;
  readonly course:
    | { readonly kind: 'for'; readonly lengths: readonly PhaseLength[] }
    | { readonly kind: 'until'; readonly condition: Condition }
    | { readonly kind: 'to the end' };
  readonly atLapEnd: boolean;
}

// ---- rules ---------------------------------------------------------------------------------

export type Moment =
  | (Located & { readonly kind: 'reaches'; readonly place: Sum })
  | (Located & { readonly kind: 'enters' | 'leaves'; readonly span: SpanExpr })
  | (Located & { readonly kind: 'begins'; readonly what: 'lap' | 'cell' | 'session' | NameRef })
  | (Located & { readonly kind: 'fires'; readonly rule: NameRef })
  | (Located & { readonly kind: 'rises' | 'falls'; readonly input: NameRef })
  | (Located & { readonly kind: 'lick'; readonly within?: SpanExpr })
  | (Located & {
      readonly kind: 'nth lick';
      readonly nth: number;
      readonly within?: SpanExpr;
      readonly stretch: Stretch;
    })
  | (Located & {
      readonly kind: 'bout';
      readonly count: Sum;
      readonly time: Sum;
      readonly within?: SpanExpr;
    })
  | (Located & { readonly kind: 'presses'; readonly button: NameRef });

export type When =
  | Moment
  | (Located & { readonly kind: 'after'; readonly delay: Sum; readonly moment: Moment })
  | (Located & { readonly kind: 'every'; readonly interval: Sum })
  | (Located & { readonly kind: 'every row'; readonly table: NameRef })
  | (Located & {
      readonly kind: 'becomes';
      readonly condition: Condition;
      readonly lasting?: Sum;
    });

export type UntilThen = Located & { readonly while?: Condition; readonly upTo: Sum };
export type ActionBody =
  | (Located & { readonly kind: 'give'; readonly volume: Sum; readonly from?: NameRef })
  | (Located & {
      readonly kind: 'pulse';
      readonly output: NameRef;
      readonly width: Sum;
      readonly train?: {
        readonly rate: Sum;
        /** Either a count of pulses or a stretch of time. */
        readonly times?: Sum;
        readonly until?: UntilThen;
      };
    })
  | (Located & { readonly kind: 'hold'; readonly output: NameRef; readonly until: UntilThen })
  | (Located & { readonly kind: 'stop'; readonly output: NameRef })
  | (Located & { readonly kind: 'note' })
  | (Located & { readonly kind: 'go to'; readonly phase: NameRef | 'next phase' })
  | (Located & { readonly kind: 'end session' });
export interface Action extends Located {
  readonly delay?: Sum;
  readonly body: ActionBody;
}

export type Cap =
  | (Located & {
      readonly kind: 'per';
      readonly count: Sum;
      readonly per: 'lap' | 'phase' | 'cell' | 'session' | Sum;
    })
  | (Located & { readonly kind: 'apart time'; readonly time: Sum })
  | (Located & { readonly kind: 'apart laps'; readonly laps: Sum });

/** What the operator may ask of a rule: to fire at once, and in so many of the next laps at most. */
export type Asked = Located & { readonly now: boolean; readonly laps?: Sum };

export interface RuleDecl extends Located {
  readonly name: NameRef;
  readonly when: When;
  readonly if?: Condition;
  /** A share, 0 to 1. */
  readonly chance?: Quantity;
  readonly sham?: Condition;
  readonly do: readonly Action[];
  readonly limits: readonly Cap[];
  readonly within?: Sum;
  readonly asked?: Asked;
}

export interface RulesFile {
  readonly sources: readonly Source[];
  readonly title: string;
  readonly beltLengthCm: Quantity;
  readonly values: readonly ValueDecl[];
  readonly operator: readonly OperatorDecl[];
  readonly tables: readonly TableDecl[];
  readonly draws: readonly DrawDecl[];
  readonly places: readonly PlaceDecl[];
  readonly phases: readonly PhaseDecl[];
  readonly rules: readonly RuleDecl[];
  readonly end?: Condition;
}
