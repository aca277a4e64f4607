import type { GuardConfig } from '../../guard/guard.js';
import type { BeltConfig } from '../../track/beltConfig.js';
import { factsOf, type Rig } from './rig.js';

/** What the tracker needs of a rig. */
export function beltOf(rig: Rig): BeltConfig {
  const { belt, lick } = rig;
  return {
    lengthCm: belt.lengthCm,
    countsPerCm: belt.countsPerCm,
    direction: belt.reversed ? -1 : 1,
    seam:
      belt.seam === undefined
        ? null
        : {
            input: belt.seam.line,
            offsetCm: belt.seam.offsetCm,
            warnCm: belt.seam.warnCm,
            stopCm: belt.seam.stopCm,
          },
    lick:
      lick === undefined
        ? null
        : {
            input: lick.line,
            lockoutUs: lick.lockoutUs,
            artefactUs: lick.artefactUs,
            stuckUs: lick.stuckUs,
          },
    speedWindowUs: belt.speedWindowUs,
  };
}

/** What the guard needs of a rig, and of what the animal was given earlier today. */
export function guardConfigOf(rig: Rig, waterTodayNl: number): GuardConfig {
  const facts = factsOf(rig).outputs;
  const { countsPerCm } = rig.belt;
  return {
    outputs: rig.outputs.map((output, index) => ({
      ...facts[index]!,
      leastCounts: Math.round(output.leastTravelCm * countsPerCm),
    })),
    water: {
      perSessionNl: rig.water.perSessionNl,
      perDayNl: rig.water.perDayNl,
      mostDropNl: rig.water.largestDropNl,
      givenTodayNl: waterTodayNl,
    },
  };
}
