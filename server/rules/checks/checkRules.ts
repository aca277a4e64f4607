import type { RulesFile } from '../ast.js';
import type { RigFacts } from '../facts.js';
import { inOrder, type Problem, ProblemList } from '../problems.js';
import type { Check } from './check.js';
import { belt } from './errors/belt.js';
import { circles } from './errors/circles.js';
import { constants } from './errors/constants.js';
import { drawChoices } from './errors/drawChoices.js';
import { drawHabits } from './errors/drawHabits.js';
import { expansion } from './errors/expansion.js';
import { firingCircles } from './errors/firingCircles.js';
import { names } from './errors/names.js';
import { onBelt } from './errors/onBelt.js';
import { onTimes } from './errors/onTimes.js';
import { ranges } from './errors/ranges.js';
import { rigNames } from './errors/rigNames.js';
import { sealedDraws } from './errors/sealedDraws.js';
import { units } from './errors/units.js';
import { visits } from './errors/visits.js';
import { words } from './errors/words.js';
import { resolve } from './symbols.js';
import { blockUnfinished } from './warnings/blockUnfinished.js';
import { dutyBeyondRig } from './warnings/dutyBeyondRig.js';
import { endsEarly } from './warnings/endsEarly.js';
import { endsMidLap } from './warnings/endsMidLap.js';
import { fewChoices } from './warnings/fewChoices.js';
import { isOnMeasured } from './warnings/isOnMeasured.js';
import { limitBeyondRig } from './warnings/limitBeyondRig.js';
import { limitIdle } from './warnings/limitIdle.js';
import { nearSeam } from './warnings/nearSeam.js';
import { neverTrue } from './warnings/neverTrue.js';
import { noEnd } from './warnings/noEnd.js';
import { noLimit } from './warnings/noLimit.js';
import { noWayOut } from './warnings/noWayOut.js';
import { oneChoice } from './warnings/oneChoice.js';
import { outlastsStay } from './warnings/outlastsStay.js';
import { phaseUnreached } from './warnings/phaseUnreached.js';
import { sameOutput } from './warnings/sameOutput.js';
import { staleDraw } from './warnings/staleDraw.js';
import { trueAtStart } from './warnings/trueAtStart.js';
import { unusedName } from './warnings/unusedName.js';
import { windowTooLong } from './warnings/windowTooLong.js';
import { withinTooTight } from './warnings/withinTooTight.js';

/** Whether amounts can be reckoned at all. */
const RECKONABLE: readonly Check[] = [circles, expansion];

/** What can be told of any file. */
const PLAIN_ERRORS: readonly Check[] = [constants, visits, firingCircles, belt, rigNames];

/** What must be right before anything may run; these reckon amounts. */
const ERRORS: readonly Check[] = [
  names,
  words,
  units,
  ranges,
  onTimes,
  drawChoices,
  drawHabits,
  sealedDraws,
  onBelt,
];

/** What is legal and suspicious; looked for only in a file without errors. */
const WARNINGS: readonly Check[] = [
  neverTrue,
  phaseUnreached,
  windowTooLong,
  limitIdle,
  unusedName,
  noLimit,
  sameOutput,
  endsMidLap,
  endsEarly,
  trueAtStart,
  staleDraw,
  blockUnfinished,
  oneChoice,
  isOnMeasured,
  limitBeyondRig,
  dutyBeyondRig,
  outlastsStay,
  withinTooTight,
  nearSeam,
  fewChoices,
  noEnd,
  noWayOut,
];

/**
 * Checks a parsed file: every error at once, and the warnings when there is no error.
 * @param rig without it nothing of the rig is checked
 * @param broken names whose phrase could not be parsed: `Parsed.broken`
 */
export function checkRules(
  file: RulesFile,
  rig?: RigFacts,
  broken: ReadonlySet<string> = new Set(),
): Problem[] {
  const problems = new ProblemList();
  const context = { file, rig, symbols: resolve(file, rig, broken), problems };
  for (const check of PLAIN_ERRORS) check(context);
  for (const check of RECKONABLE) {
    check(context);
    // Nothing may be reckoned from names that need each other.
    const stuck = ({ code }: Problem): boolean => code === 'circle' || code === 'tooLarge';
    if (problems.problems.some(stuck)) return inOrder(problems.problems);
  }
  for (const check of ERRORS) check(context);
  if (!problems.failed) for (const check of WARNINGS) check(context);
  return inOrder(problems.problems);
}
