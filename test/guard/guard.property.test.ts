import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { dice } from '../track/beltModel.js';
import { HostileRig } from './hostileRig.js';

describe('a million random sequences of commands, on a board that cuts, refuses and forgets', () => {
  it('never pass a limit, and the books agree with what ran', { timeout: 300_000 }, () => {
    let sequences = 0;
    let agreed = 0;
    let withheld = 0;
    fc.assert(
      fc.property(fc.integer(), (seed) => {
        const roll = dice(seed);
        for (let i = 0; i < 1000; i++) {
          const rig = new HostileRig(roll);
          // Most are short; a few are long enough to use up every limit.
          const commands = i % 100 === 0 ? 60 : 1 + Math.floor(roll() * 3);
          for (let c = 0; c < commands; c++) rig.command();
          const broken = rig.broken();
          if (broken !== undefined) throw new Error(`sequence ${i}: broken: ${broken}`);
          sequences++;
          agreed += rig.agreed;
          withheld += rig.withheld;
        }
      }),
      { seed: 20_261_201, numRuns: 1000 },
    );
    expect(sequences).toBe(1_000_000);
    // The limits were met from both sides.
    expect(agreed).toBeGreaterThan(500_000);
    expect(withheld).toBeGreaterThan(500_000);
  });
});
