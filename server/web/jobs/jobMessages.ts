/** What is said of long work: by its process to the web process, and by that to the pages. */

/** What a job's process reports. */
export type JobReport =
  | { readonly report: 'progress'; readonly done: number; readonly doing: string }
  | { readonly report: 'done'; readonly result: unknown }
  | {
      readonly report: 'failed';
      readonly code: string;
      readonly detail: string;
      readonly remedy: string;
    };

export type JobState =
  /** `ahead` of it in the queue. */
  | { readonly state: 'waiting'; readonly ahead: number }
  /** The share done, 0 to 1, and what it is doing. */
  | { readonly state: 'running'; readonly done: number; readonly doing: string }
  | { readonly state: 'done'; readonly tookS: number; readonly result: unknown }
  | {
      readonly state: 'failed';
      readonly code: string;
      readonly detail: string;
      readonly remedy: string;
    }
  | { readonly state: 'cancelled' };

/** One piece of long work, as the page is told of it. */
export type JobTold = {
  readonly id: string;
  /** What is done: `report`, `replay`, ... */
  readonly kind: string;
  /** What it is done to: a session's name, or several. */
  readonly about: readonly string[];
  /** RFC 3339. */
  readonly askedAt: string;
} & JobState;
