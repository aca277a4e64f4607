import type { HostMessageName, MessageOf } from '../../wire/messages.js';
import type { StampedDecision } from '../decisions.js';

/** Where a session's commands and decisions go: to the board and the record, or to a replay. */
export interface CoreOutput {
  /** Send this to the board now. The message is the receiver's to keep. */
  command<N extends HostMessageName>(name: N, message: MessageOf[N]): void;
  decision(decision: StampedDecision): void;
}
