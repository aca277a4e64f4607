/**
 * What the web process says over `/api/stream`, one JSON object a websocket message. The page can
 * answer `{"ask":"quiet"}`, a second way to stop everything beside `POST /api/quiet`.
 *
 * `?after=N&life=L` in the address asks for events after number N of that life of the loop; without it
 * the newest that are kept.
 */
import type { NumberedEvent, Setup, Snapshot } from '../loop/protocol.js';
import type { Held, YouMessage } from './access/accessMessages.js';

export const STREAM_VERSION = 1;

export type StreamMessage =
  | {
      readonly tell: 'welcome';
      readonly version: number;
      readonly lapwing: string;
      readonly you: YouMessage;
    }
  /** Who holds the controls, where people sign in: at first and at each change. */
  | { readonly tell: 'controls'; readonly controls: Held }
  /** Whether the web process has the loop; while it is away, whatever is shown is old. */
  | {
      readonly tell: 'loop';
      readonly state: 'up' | 'away';
      /** Changes when events are told anew from the oldest kept: forget the ones told before. */
      readonly life: string;
      readonly reason: string;
      readonly remedy: string;
    }
  | { readonly tell: 'setup'; readonly setup: Setup }
  /** Latest only. */
  | { readonly tell: 'state'; readonly state: Snapshot }
  | { readonly tell: 'events'; readonly events: readonly NumberedEvent[] }
  /** Events `from` to `to` are in the record and were not sent. */
  | { readonly tell: 'gap'; readonly from: number; readonly to: number }
  /** The answer to `{"ask":"quiet"}`: the loop said done, or why not. */
  | { readonly tell: 'quiet'; readonly done: boolean; readonly detail: string };

/** RFC 9457 problem details, with our stable code and what to do about it. */
export interface Problem {
  readonly type: string;
  readonly title: string;
  readonly status: number;
  readonly detail: string;
  readonly code: string;
  readonly remedy: string;
  readonly errors?: readonly { readonly pointer: string; readonly message: string }[];
}
