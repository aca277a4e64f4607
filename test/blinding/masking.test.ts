import { describe, expect, it } from 'vitest';
import { rehearse } from '../../server/session/rehearsal.js';
import type { Rig } from '../../server/session/rig/rig.js';
import { demoRig, KeepAll, setupOf, virtualRig } from '../session/rehearsed.js';

const RULES = `title: Masked
belt: 180 cm
draws:
  arm: stim or sham, every session, sealed
rules:
  induce:
    when: reaches 45 cm
    sham: arm is sham
    do:
      - pulse gate for 100 ms
      - pulse marker for 50 ms
      - pulse sync for 10 ms
    limit: 1 per lap
    within: 1 cm
end: laps done this session >= 4
`;

/** The demo's rig, whose marker masks. */
const rig: Rig = {
  ...demoRig,
  outputs: demoRig.outputs.map((output) =>
    output.name === 'marker' ? { ...output, masking: true } : output,
  ),
};

/** How often each output was driven, by the board's word. */
function driven(arm: string, on: Rig): Record<string, number> {
  const kept = new KeepAll();
  const setup = { ...setupOf(RULES, 'a seed', on), arm };
  rehearse(setup, virtualRig(), { mostUs: 300_000_000, recorder: kept });
  const counts: Record<string, number> = {};
  for (const decision of kept.decisions) {
    if (decision.kind !== 'pulse done') continue;
    counts[decision.output] = (counts[decision.output] ?? 0) + 1;
  }
  return counts;
}

describe('an output that masks the stimulus', () => {
  it('runs in shams as in real firings, and the stimulus does not', () => {
    const real = driven('stim', rig);
    const sham = driven('sham', rig);
    expect(real.gate).toBeGreaterThan(2);
    expect(real.marker).toBe(real.gate);
    expect(sham).toEqual({ marker: real.marker });
  });

  it('stays off in shams where the rig file does not say that it masks', () => {
    expect(driven('sham', demoRig)).toEqual({});
  });
});

describe('a sealed draw', () => {
  it('is what the allocation says, and left to chance in a rehearsal that has none', () => {
    const drawn = (seed: string, arm?: string) => {
      const kept = new KeepAll();
      const setup = { ...setupOf(RULES, seed), ...(arm === undefined ? {} : { arm }) };
      rehearse(setup, virtualRig(), { mostUs: 100_000, recorder: kept });
      return kept.decisions.flatMap((one) => (one.kind === 'drawn' ? [one.value] : []));
    };
    expect(drawn('x', 'sham')).toEqual(['sealed']);
    const seeds = Array.from({ length: 8 }, (_, n) => drawn(`seed ${n}`)[0]);
    expect(new Set(seeds)).toEqual(new Set(['stim', 'sham']));
  });
});
