import { LapwingError } from '../../errors/codes.js';
import type { BenchItem, BenchNow, Tried, TryRequest } from '../../loop/protocol.js';
import type { CheckedItem } from '../../session/preflight.js';
import type { CalibrationKind } from '../../session/rig/calibration.js';
import type { Rig } from '../../session/rig/rig.js';

/** What a guide may do with the rig: watch its edges, and try outputs one pulse at a time. */
export interface GuideBench {
  readonly now: BenchNow;
  readonly board: {
    readonly model: string;
    readonly boardId: number;
    readonly firmware: number;
    readonly simulated: boolean;
  };
  /** Called with everything that the bench shows, until the returned function is called. */
  listen(take: (item: BenchItem) => void): () => void;
  attempt(request: TryRequest): Promise<Tried>;
  /** Whether every frame is timed as well. */
  timeFrames(on: boolean): Promise<void>;
}

/** The hands of a simulated rig: a command, and what it answered. */
export type Hands = (command: string) => Promise<Readonly<Record<string, unknown>>>;

/** Where a guide is: what to do now, how far it has come, and what has been measured so far. */
export interface GuideView {
  readonly title: string;
  /** What the person is to do, or what is being done. */
  readonly text: string;
  /** 0 to 1; null where there is nothing to count. */
  readonly done: number | null;
  readonly pictures: readonly Picture[];
  /** Of a pre-flight: what was checked so far. */
  readonly checks?: readonly CheckedItem[];
  /** What must be read before going on. */
  readonly caution?: string;
}

/** One thing to be filled in; its name is the answer's. */
export type Field =
  | {
      readonly kind: 'number';
      readonly name: string;
      readonly label: string;
      readonly unit: string;
      readonly least: number;
      readonly most: number;
      /** Offered; without one it has to be filled in. */
      readonly value?: number;
    }
  | {
      readonly kind: 'choice';
      readonly name: string;
      readonly label: string;
      readonly options: readonly string[];
      readonly value: string;
    }
  | {
      readonly kind: 'text';
      readonly name: string;
      readonly label: string;
      readonly value: string;
    };

/** What a guide waits for. */
export interface Question {
  readonly fields: readonly Field[];
  /** What the button that goes on says. */
  readonly go: string;
}
export type Answers = Readonly<Record<string, number | string>>;

/** Whoever stands in front of a guide: a terminal or a page. */
export interface Desk {
  readonly rig: Rig;
  readonly bench: GuideBench;
  /** On a simulated rig alone. */
  readonly hands: Hands | undefined;
  readonly by: string;
  now(): Date;
  /** Waits so long; throws when the guide is cancelled. */
  pause(ms: number): Promise<void>;
  show(view: GuideView): void;
  ask(question: Question): Promise<Answers>;
}

/** Something measured, to be drawn. */
export type Picture =
  | {
      readonly draw: 'laps';
      readonly title: string;
      readonly unit: string;
      readonly laps: readonly { readonly counts: number; readonly outlying: boolean }[];
      readonly median: number;
    }
  | {
      readonly draw: 'line';
      readonly title: string;
      readonly xUnit: string;
      readonly yUnit: string;
      /** Each with its residual and half the band's width. */
      readonly points: readonly {
        readonly x: number;
        readonly y: number;
        readonly residual: number;
        readonly band: number;
      }[];
      readonly offset: number;
      readonly slope: number;
    }
  | {
      readonly draw: 'histogram';
      readonly title: string;
      readonly unit: string;
      readonly edges: readonly number[];
      readonly counts: readonly number[];
      /** Where something stands on the same axis. */
      readonly marks: readonly { readonly at: number; readonly label: string }[];
    };

/** What a guide found, before it is kept. */
export interface Draft {
  readonly kind: CalibrationKind;
  readonly of: string;
  readonly warnAfterDays: number;
  readonly values: Readonly<Record<string, number | string>>;
  readonly uncertainty: Readonly<Record<string, number>>;
  readonly method: string;
  readonly measured: unknown;
  /** The result in sentences, the most important first. */
  readonly says: readonly string[];
  /** What speaks against it. */
  readonly warnings: readonly string[];
  readonly pictures: readonly Picture[];
  /** It can be put in force in the rig file. */
  readonly usable: boolean;
}

export function numberField(
  name: string,
  label: string,
  unit: string,
  least: number,
  most: number,
  value: number,
): Field {
  return { kind: 'number', name, label, unit, least, most, value };
}

export function numberFrom(answers: Answers, name: string): number {
  return Number(answers[name]);
}
export function textFrom(answers: Answers, name: string): string {
  return String(answers[name] ?? '');
}

/** A number as people read it: so many digits that matter, no exponent. */
export function figures(value: number, digits = 3): string {
  if (!Number.isFinite(value)) return String(value);
  const text = Number(value.toPrecision(digits));
  const places = Math.max(0, digits - 1 - Math.floor(Math.log10(Math.abs(text) || 1)));
  return text.toFixed(Math.min(places, 6));
}

/** An answer in the field's kind. @throws LapwingError CALIBRATE_ANSWER with what was expected */
export function checkedAnswer(field: Field, text: string | number): number | string {
  if (field.kind === 'text') return String(text);
  if (field.kind === 'choice') {
    if (field.options.includes(String(text))) return text;
    const begins = field.options.filter((option) => option.startsWith(String(text)));
    if (begins.length === 1 && text !== '') return begins[0]!;
    throw new LapwingError(
      'calibrateAnswer',
      `${field.label}: expected ${field.options.join(' or ')}, found \`${text}\`.`,
    );
  }
  const value = typeof text === 'number' ? text : Number(text);
  if (text !== '' && value >= field.least && value <= field.most) return value;
  throw new LapwingError(
    'calibrateAnswer',
    `${field.label}: expected ${field.least} to ${field.most} ${field.unit}, found \`${text}\`.`,
  );
}
