import type { HostMessageName, MessageOf, Sample } from '../wire/messages.js';
import type { CoreOutput } from './core/coreOutput.js';
import { SessionCore, type SessionSetup } from './core/sessionCore.js';
import type { StampedDecision } from './decisions.js';
import type { RareInput } from './inputs.js';

/** Where commands go at once; false is no concern of the runner: the link tells of its loss. */
export type SendCommand = <N extends HostMessageName>(name: N, message: MessageOf[N]) => void;

/** What keeps a session's inputs, commands and decisions; the record, or nothing. */
export interface SessionRecorder {
  sample(input: number, message: Sample): void;
  input(input: number, what: RareInput): void;
  command<N extends HostMessageName>(input: number, name: N, message: MessageOf[N]): void;
  decision(decision: StampedDecision): void;
  batchEnd(commanded: boolean): void;
}

type Pending =
  | { readonly name: HostMessageName; readonly message: MessageOf[HostMessageName] }
  | { readonly decision: StampedDecision };

/**
 * Runs one session: each input is decided on, its commands are sent, and only then is it all
 * recorded, the input first. Live, rehearsed: the same code.
 */
export class SessionRunner implements CoreOutput {
  readonly core: SessionCore;
  readonly #send: SendCommand;
  #recorder: SessionRecorder | undefined;
  readonly #onDecision: ((decision: StampedDecision) => void) | undefined;
  readonly #pending: Pending[] = [];
  #commanded = false;
  #muted = false;

  constructor(
    setup: SessionSetup,
    send: SendCommand,
    recorder?: SessionRecorder,
    onDecision?: (decision: StampedDecision) => void,
  ) {
    this.#send = send;
    this.#recorder = recorder;
    this.#onDecision = onDecision;
    this.core = new SessionCore(setup, this);
  }

  sample(message: Sample): void {
    this.core.sample(message);
    if (this.#muted) return;
    this.#recorder?.sample(this.core.input, message);
    if (this.#pending.length > 0) this.#keep();
  }

  take(input: RareInput): void {
    this.core.take(input);
    if (this.#muted) return;
    this.#recorder?.input(this.core.input, input);
    if (this.#pending.length > 0) this.#keep();
  }

  /** Everything that came at once has been taken: the record may be written. */
  batchEnd(): void {
    this.#recorder?.batchEnd(this.#commanded);
    this.#commanded = false;
  }

  /**
   * Feeds inputs that were recorded before the loop was restarted: the state becomes what it was,
   * nothing is sent and nothing is recorded again. Decisions are still told to whoever listens.
   */
  replay(feed: () => void): void {
    this.#muted = true;
    try {
      feed();
    } finally {
      this.#muted = false;
      this.#pending.length = 0;
    }
  }

  /** Records from now on: for a resumed session, whose record goes on once it has been replayed. */
  recordTo(recorder: SessionRecorder): void {
    this.#recorder = recorder;
  }

  command<N extends HostMessageName>(name: N, message: MessageOf[N]): void {
    if (this.#muted) return;
    this.#send(name, message);
    if (name !== 'beat') this.#commanded = true;
    if (this.#recorder !== undefined) this.#pending.push({ name, message });
  }

  decision(decision: StampedDecision): void {
    this.#onDecision?.(decision);
    if (!this.#muted && this.#recorder !== undefined) this.#pending.push({ decision });
  }

  #keep(): void {
    const recorder = this.#recorder!;
    for (const item of this.#pending) {
      if ('decision' in item) recorder.decision(item.decision);
      else recorder.command(this.core.input, item.name, item.message);
    }
    this.#pending.length = 0;
  }
}
