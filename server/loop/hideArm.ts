import type { LiveMask } from '../session/blinding/liveMask.js';
import type { Rig } from '../session/rig/rig.js';
import type { Snapshot } from './protocol.js';

/**
 * The state as a blinded session shows it: a rule that may be sham has fired as often as its firings
 * were shown, is never said to be armed, and what it drives looks idle.
 */
export function hideArm(state: Snapshot, mask: LiveMask, rig: Rig): Snapshot {
  let hidden = 0;
  rig.outputs.forEach(({ name }, index) => {
    if (mask.mask.hidesOutput(name)) hidden |= 1 << index;
  });
  // An input that is wired back from one of them tells as much.
  const { loopback } = rig;
  const listens = loopback !== undefined && mask.mask.hidesOutput(loopback.output);
  const back = listens ? 1 << rig.inputs.findIndex(({ name }) => name === loopback.input) : 0;
  return {
    ...state,
    outputs: state.outputs & ~hidden,
    inputs: state.inputs & ~back,
    // Only a real firing has anything for the board to confirm.
    choices: state.choices.map((choice) => ({ ...choice, waits: false })),
    rules: state.rules.map((rule) =>
      mask.mask.hidesRule(rule.name)
        ? { ...rule, firings: mask.firings(rule.name), shams: 0, armed: false }
        : rule,
    ),
  };
}
