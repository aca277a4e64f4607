import type { Guard } from '../../guard/guard.js';
import { murmur3 } from '../../rules/engine/hash.js';
import { CONFIGURE_FLAG, type Configure } from '../../wire/messages.js';
import type { Rig } from '../rig/rig.js';

/**
 * The limits that the board holds by itself, one message an output: what is left of each allowance,
 * so that a board which is told again after a reconnection gives no more in all.
 */
export function configureOutputs(rig: Rig, guard: Guard, overNetwork: boolean): Configure[] {
  return guard.allowances().flatMap((allowance) => {
    const output = rig.outputs.find(({ line }) => line === allowance.output)!;
    // What is never configured never fires.
    if (overNetwork && output.kind === 'stimulus') return [];
    const flags =
      (output.idleHigh ? CONFIGURE_FLAG.idleHigh : 0) |
      (output.finishOnSilence ? CONFIGURE_FLAG.finishOnSilence : 0);
    return [{ ...allowance, flags }];
  });
}

/** The seed of the board's sync train, from the session's; never 0, which a xorshift cannot leave. */
export function syncSeed(seed: string): number {
  return murmur3(`${seed}\nsync train`, 0) || 1;
}
