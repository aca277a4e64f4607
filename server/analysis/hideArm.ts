import { Mask, maskedDecisions } from '../session/blinding/mask.js';
import type { StampedDecision } from '../session/decisions.js';
import type { LoadedSession } from '../session/loadSession.js';
import type { PulseShape } from './pulses.js';
import type { EdgeSeen } from './readSession.js';
import type { SampleColumns } from './sampleColumns.js';

export interface Readings {
  readonly samples: SampleColumns;
  readonly edges: readonly EdgeSeen[];
  readonly shapes: ReadonlyMap<number, PulseShape>;
  readonly decisions: readonly StampedDecision[];
}

/** The mask of a session that is sealed still; undefined where everything may be shown. */
export function maskOf({ description, rules }: LoadedSession): Mask | undefined {
  const { blinding } = description;
  const { sealed } = rules.program;
  if (blinding === undefined || blinding.opened !== undefined || sealed === undefined)
    return undefined;
  return new Mask(sealed);
}

/**
 * What every report, table and export is made from, without what would show the arm of a session that
 * is sealed still: levels and pulses of what it decides about, and whatever listens to them.
 */
export function hideArmIn(session: LoadedSession, readings: Readings): Readings {
  const mask = maskOf(session);
  if (mask === undefined) return readings;
  const { rig } = session;
  const { samples, edges, shapes, decisions } = readings;
  let outputs = 0;
  for (const { name, line } of rig.outputs) if (mask.hidesOutput(name)) outputs |= 1 << line;
  for (let n = 0; n < samples.length; n++) samples.outputs[n]! &= ~outputs;
  const listening = new Set<string>();
  if (rig.loopback !== undefined && mask.hidesOutput(rig.loopback.output)) {
    listening.add(rig.loopback.input);
    const line = rig.inputs.find(({ name }) => name === rig.loopback!.input)?.line ?? 0;
    for (let n = 0; n < samples.length; n++) samples.inputs[n]! &= ~(1 << line);
  }
  return {
    samples,
    edges: edges.filter(({ name }) => !mask.hidesOutput(name) && !listening.has(name)),
    shapes: new Map([...shapes].filter(([, { output }]) => !mask.hidesOutput(output))),
    decisions: maskedDecisions(decisions, mask),
  };
}
