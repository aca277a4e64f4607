/** What the web process and the process that rehearses for it say to each other. */
import type { ManyResult, RehearsalResult } from '../rules/rulesMessages.js';

export interface RehearsalTask {
  readonly rigPath: string;
  readonly rulesFolder: string;
  /** Below the rules folder; where the text stands, or would. */
  readonly path: string;
  readonly text: string;
  readonly seed: string;
  readonly animalSeed: number;
  readonly trained: boolean;
  /** A session that does not end by itself is ended after this long. */
  readonly minutes: number;
  /** More than one: how so many sessions differ, each with another animal. */
  readonly runs: number;
}

export type RehearsalReport =
  | { readonly report: 'progress'; readonly sessionS: number }
  | { readonly report: 'runs'; readonly done: number }
  | { readonly report: 'done'; readonly result: RehearsalResult }
  | { readonly report: 'many done'; readonly result: ManyResult }
  | {
      readonly report: 'failed';
      readonly code: string;
      readonly detail: string;
      readonly remedy: string;
    };
