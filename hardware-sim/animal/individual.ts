import { Dice } from './dice.js';
import { type AnimalParameters, PARAMETERS } from './parameters.js';

/** What differs between animals as a whole; a pair is scaled by one factor. */
const VARIES: readonly (readonly (keyof AnimalParameters)[])[] = [
  ['slowestCruiseCmPerS', 'fastestCruiseCmPerS'],
  ['boutS'],
  ['pauseS'],
  ['dryLicks'],
  ['naiveBoutsPerS', 'trainedBoutsPerS'],
  ['anticipationCm'],
  ['learningPerDrop'],
  ['quenchedUl'],
];

/**
 * One animal of its kind: the parameters that make animals differ, each times a factor of about
 * log-normal spread `betweenAnimals`, within their bounds.
 * @param seed the same seed gives the same animal
 */
export function individual(kind: AnimalParameters, seed: number): AnimalParameters {
  const dice = new Dice(seed);
  const own: Record<keyof AnimalParameters, number> = { ...kind };
  for (const keys of VARIES) {
    const factor = Math.exp(kind.betweenAnimals * dice.normal());
    for (const key of keys) {
      const { least, most } = PARAMETERS[key];
      own[key] = Math.min(most, Math.max(least, kind[key] * factor));
    }
  }
  // What is still missing to certainty is scaled, so that skill stays between 0 and 1.
  const factor = Math.exp(kind.betweenAnimals * dice.normal());
  own.trainedSkill = Math.max(0, 1 - (1 - kind.trainedSkill) * factor);
  return own;
}
