import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import type { RunsSetting } from '../../server/main/runOnce.js';
import { DEFAULT_LATENCY } from '../../server/rehearse/latency.js';
import { checkText } from '../../server/rules/readRules.js';
import { factsOf } from '../../server/session/rig/rig.js';
import { demoRig } from '../session/rehearsed.js';

/** What it takes to rehearse this text many times on the demo's rig. */
export function settingOf(text: string, change: Partial<RunsSetting> = {}): RunsSetting {
  const { rig = demoRig } = change;
  const { file, problems } = checkText('rules.yaml', text, factsOf(rig));
  if (file === undefined) throw new Error(problems.map(({ message }) => message).join('\n'));
  return {
    ...{ rig, file, seed: 'a seed', animal: ANIMAL, trained: true, minutes: 3 },
    ...{ everyFrame: false, latency: DEFAULT_LATENCY },
    ...change,
  };
}

/** Water at one place, for a fixed number of laps. */
export const WATER = `title: water
belt: 180 cm
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
end: lap >= 6
`;
