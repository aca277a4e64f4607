import type { FieldPrediction } from '../plasticity/fieldPrediction.js';
import type { Trust } from '../rules/instant.js';
import type { AlarmLevel, OperatorAct } from './inputs.js';

/** Where and when a decision was taken, and the input that caused it. */
export interface Stamp {
  /** Sequence number of the engine input. */
  readonly input: number;
  /** Extended board time, microseconds. */
  readonly boardUs: number;
  readonly lap: number;
  /** null while position is unknown. */
  readonly positionCm: number | null;
  readonly speedCmPerS: number;
}

/** What the session decided or found: the record's second half, and the dashboard's event list. */
export type Decision =
  | { readonly kind: 'session began'; readonly title: string; readonly seed: string }
  | { readonly kind: 'session ended'; readonly reason: string }
  | { readonly kind: 'lap began'; readonly lap: number }
  | {
      readonly kind: 'seam';
      readonly event: 'first' | 'accepted' | 'ignored' | 'missed' | 'rehomed';
      /** Where the mark was met, less where it was expected; null where there was no mark. */
      readonly slipMm: number | null;
    }
  | { readonly kind: 'trust'; readonly trust: Trust; readonly reason: string }
  | { readonly kind: 'lick'; readonly artefact: boolean }
  | { readonly kind: 'lick sensor'; readonly state: 'stuck' | 'released' | 'too fast' }
  | {
      readonly kind: 'asked' | 'armed';
      readonly rule: string;
      readonly serial: number;
      readonly ids: readonly number[];
      readonly placeCm: number | null;
      /** null while it waits in a slot, for which there is no last moment. */
      readonly expiryUs: number | null;
    }
  | {
      readonly kind: 'disarmed';
      readonly rule: string;
      readonly serial: number;
      readonly reason: string;
    }
  | {
      readonly kind: 'fired';
      readonly rule: string;
      readonly serial: number;
      readonly sham: boolean;
      /** Started by the board's own slot, or decided in the host. */
      readonly armed: boolean;
      readonly output: string | null;
      readonly riseUs: number | null;
      readonly placeCm: number | null;
      /** Where the rise was, and its distance from the place intended. */
      readonly riseCm: number | null;
      readonly errorMm: number | null;
    }
  | {
      readonly kind: 'pulse done';
      readonly rule: string | null;
      readonly output: string;
      readonly onUs: number;
      readonly volumeNl: number;
      readonly reason: string;
    }
  | {
      readonly kind: 'withheld' | 'missed' | 'refused' | 'uncertain';
      readonly rule: string;
      readonly serial: number;
      readonly reason: string;
    }
  | {
      readonly kind: 'drawn';
      readonly draw: string;
      readonly scope: string;
      readonly index: number;
      readonly value: number | string;
    }
  | {
      readonly kind: 'phase began';
      readonly phase: string;
      readonly index: number;
      readonly reason: string;
    }
  | {
      readonly kind: 'cell began';
      readonly index: number;
      readonly fields: Readonly<Record<string, string>>;
    }
  | {
      readonly kind: 'note';
      /** Empty: a mark, whose words may come later. */
      readonly text: string;
      /** The mark that it is, or puts into words, and when that was made; earlier builds had none. */
      readonly mark?: number | null;
      readonly markedUs?: number | null;
    }
  /** The field that an induction is predicted to leave, reckoned a second after it. */
  | ({
      readonly kind: 'field predicted';
      readonly rule: string;
      readonly serial: number;
      /** Over the belt in even bins from 0 cm, as a share of its peak. */
      readonly curve: readonly number[];
    } & FieldPrediction)
  | {
      readonly kind: 'end foreseen';
      /** Laps left, the present one counted in; null while no pace is known. */
      readonly laps: number | null;
      /** Seconds left, where a time ends it. */
      readonly s: number | null;
      /** Reckoned in laps alone, and not by the pace so far. */
      readonly exact: boolean;
      readonly reason: string;
    }
  /** An operator's choice counts; and, where it moves what the board has armed, the board has it. */
  | {
      readonly kind: 'choice';
      readonly name: string;
      readonly value: number | string;
      readonly state: 'in force' | 'armed anew';
    }
  | {
      readonly kind: 'alarm';
      readonly alarm: string;
      readonly state: 'raised' | 'cleared';
      readonly level: AlarmLevel;
      readonly text: string;
      readonly remedy: string;
    }
  | {
      readonly kind: 'operator';
      readonly act: OperatorAct;
      readonly who: string;
      readonly from: string;
    }
  | { readonly kind: 'link'; readonly state: 'up' | 'down' | 'resumed'; readonly reason: string }
  | { readonly kind: 'board fault'; readonly fault: string; readonly detail: number }
  | { readonly kind: 'frames lost'; readonly frames: number; readonly why: string };

export type StampedDecision = Stamp & Decision;
