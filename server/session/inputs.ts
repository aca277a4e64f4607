import type { Clock, Edge, Fault, Identity, Outcome, Sample } from '../wire/messages.js';

/**
 * Everything that can change what the engine decides, in one order. The record keeps exactly this
 * list, and a replay feeds it back; nothing else reaches the engine.
 */
export type EngineInput =
  | { readonly kind: 'sample'; readonly message: Sample }
  | { readonly kind: 'edge'; readonly message: Edge }
  | { readonly kind: 'outcome'; readonly message: Outcome }
  | { readonly kind: 'fault'; readonly message: Fault }
  | { readonly kind: 'clock'; readonly message: Clock }
  | {
      readonly kind: 'link up';
      readonly identity: Identity;
      readonly tag: number;
      /** The board had not restarted since it was last heard. */
      readonly sameBoot: boolean;
      /** Over a network: real stimuli are refused. */
      readonly overNetwork: boolean;
    }
  | { readonly kind: 'link down'; readonly reason: string }
  /** Frames that the sequence numbers say were lost. */
  | { readonly kind: 'gap'; readonly frames: number }
  | { readonly kind: 'bad frame'; readonly why: string }
  | { readonly kind: 'operator'; readonly act: OperatorAct; readonly by: Actor }
  /** The loop raises an alarm or clears one: told and recorded, and nothing is decided by it. */
  | {
      readonly kind: 'alarm';
      readonly alarm: string;
      readonly raised: boolean;
      readonly level: AlarmLevel;
      readonly text: string;
      readonly remedy: string;
    }
  /** The loop came back: what was recorded has been replayed, and this follows it. */
  | { readonly kind: 'resume'; readonly note: string }
  /** The session begins; its ids go on from those that the board knows already. */
  | { readonly kind: 'begin'; readonly firstId: number };

/** Inputs that come a few times a second at most: all but the sample. */
export type RareInput = Exclude<EngineInput, { kind: 'sample' }>;

/** `note` tells, `warn` wants a look, `bad` wants a hand. */
export type AlarmLevel = 'note' | 'warn' | 'bad';

/** Who did it and from where: `keyboard`, `dashboard 127.0.0.1`, `button box`. */
export interface Actor {
  readonly who: string;
  readonly from: string;
}

export type OperatorAct =
  | { readonly act: 'press'; readonly button: string }
  | { readonly act: 'choose'; readonly name: string; readonly value: number | string }
  | { readonly act: 'hold'; readonly what: 'stimulus' | 'water'; readonly on: boolean }
  | { readonly act: 'phase'; readonly to: string | 'next' | 'previous' | 'repeat' }
  | { readonly act: 'new cell'; readonly fields: Readonly<Record<string, string>> }
  | { readonly act: 'exclude lap'; readonly lap: number }
  /** A note; `mark` is the number of the mark that it puts into words. */
  | { readonly act: 'note'; readonly text: string; readonly mark?: number }
  /** Something is seen now; the words may come later. */
  | { readonly act: 'mark' }
  /** A rule in the next so many laps, whatever its `if` says; 0: at once. */
  | { readonly act: 'ask'; readonly rule: string; readonly laps: number }
  | { readonly act: 'withdraw'; readonly rule: string }
  /** The session's end, once it has come by itself, waits so long. */
  | { readonly act: 'put off'; readonly laps: number; readonly minutes: number }
  /** An alarm was seen; `all` are those that are on now. */
  | { readonly act: 'acknowledge'; readonly alarm: string }
  /** Stop everything: all outputs idle, stimuli and water held until released; recording goes on. */
  | { readonly act: 'stop everything' }
  /** After a board restart or a watchdog trip, stimulation waits for this. */
  | { readonly act: 'allow stimulation' }
  /** A hand turns the belt: nothing counts, nothing is given, until the next mark after it is off. */
  | { readonly act: 'hand on belt'; readonly on: boolean }
  /** The controls went from one person to another: names, null for nobody. Decides nothing. */
  | { readonly act: 'controls'; readonly holder: string | null; readonly before: string | null }
  | { readonly act: 'end'; readonly reason: string };
