/** What the Rig page is told over HTTP. */
import type { GuideView, Question } from '../../calibrate/guides/guide.js';
import type { GuideName } from '../../calibrate/guides/runGuide.js';
import type { PortDescription } from '../../link/describePorts.js';
import type { PortWarning } from '../../link/portWarnings.js';
import type { BenchItem, BenchNow, Tried } from '../../loop/protocol.js';
import type { Preflight } from '../../session/preflight.js';
import type { Calibration } from '../../session/rig/calibration.js';
import type { RigSetting } from '../../session/rig/settings.js';

export type CalibrationRow = Omit<Calibration, 'measured'> & {
  readonly inForce: boolean;
  readonly ageDays: number;
  readonly old: boolean;
};

export interface RigTold {
  readonly name: string;
  readonly path: string;
  readonly inputs: readonly { readonly name: string; readonly line: number }[];
  readonly outputs: readonly {
    readonly name: string;
    readonly line: number;
    readonly kind: 'valve' | 'stimulus' | 'mark';
    readonly longestOnUs: number;
    readonly leastGapUs: number;
  }[];
  readonly settings: readonly RigSetting[];
  readonly calibrations: readonly CalibrationRow[];
  readonly bad: readonly { readonly file: string; readonly why: string }[];
  /** The newest of the last twelve hours. */
  readonly preflight: Preflight | null;
}

export interface PortsTold {
  readonly ports: readonly PortDescription[];
  readonly warnings: readonly PortWarning[];
}

/** What has come from the bench since number `after`; `last` is what to ask with next. */
export interface BenchTold {
  readonly now: BenchNow;
  readonly last: number;
  readonly items: readonly BenchItem[];
}

export type GuideTold =
  | { readonly state: 'none' }
  | {
      readonly state: 'going' | 'asking';
      readonly guide: GuideName | 'preflight';
      readonly of: string;
      readonly view: GuideView;
      /** While it asks; a number, so that an answer meets the question it was meant for. */
      readonly question: Question | null;
      readonly number: number;
    }
  | {
      readonly state: 'done';
      readonly guide: GuideName | 'preflight';
      readonly of: string;
      readonly view: GuideView;
      /** What was kept; null where nothing was. */
      readonly kept: CalibrationRow | null;
      readonly usable: boolean;
    }
  | {
      readonly state: 'failed';
      readonly guide: GuideName | 'preflight';
      readonly of: string;
      readonly detail: string;
      readonly remedy: string;
    };

export interface TriedTold {
  readonly tried: Tried;
}
