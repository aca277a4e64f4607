import type { Identity } from '../../server/wire/messages.js';

/** A board's identity, to vary. */
export const identity: Identity = {
  nonce: 1,
  protocol: 1,
  firmware: 3,
  bootId: 0xdead_beef,
  boardId: 42,
  previousTag: 0,
  capabilities: 3,
  outputs: 4,
  inputs: 4,
  slots: 8,
  outcomesKept: 0,
  boardUs: 0,
  wraps: 0,
  resetCause: 1,
  model: 'simulated',
};
