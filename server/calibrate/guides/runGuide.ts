import type { Calibration } from '../../session/rig/calibration.js';
import { keepCalibration } from '../store.js';
import { beltGuide } from './beltGuide.js';
import type { Desk, Draft } from './guide.js';
import { latencyGuide } from './latencyGuide.js';
import { lickGuide } from './lickGuide.js';
import { valveCheckGuide, valveGuide } from './valveGuide.js';

export const GUIDES = ['belt', 'valve', 'valve check', 'lick', 'latency'] as const;
export type GuideName = (typeof GUIDES)[number];

/** What came of a guide. */
export interface GuideResult {
  readonly draft: Draft;
  /** Stored; undefined where the person did not want it kept. */
  readonly kept: Calibration | undefined;
}

/**
 * Leads a person through one calibration and keeps what they agree to.
 * @param of the valve's name, where one is meant
 */
export async function runGuide(desk: Desk, name: GuideName, of: string): Promise<GuideResult> {
  const draft = await measure(desk, name, of);
  desk.show({
    title: 'Found',
    text: [...draft.says, ...draft.warnings.map((warning) => `Look: ${warning}`)].join('\n'),
    done: 1,
    pictures: draft.pictures,
  });
  const answer = await desk.ask({
    go: 'Done',
    fields: [
      {
        ...{ kind: 'choice', name: 'keep', label: 'Keep this measurement' },
        ...{ options: ['keep it', 'throw it away'], value: 'keep it' },
      },
    ],
  });
  if (answer.keep !== 'keep it') return { draft, kept: undefined };
  return { draft, kept: keepCalibration(desk.rig, draft, desk.bench.board, desk.by, desk.now()) };
}

function measure(desk: Desk, name: GuideName, of: string): Promise<Draft> {
  switch (name) {
    case 'belt':
      return beltGuide(desk);
    case 'valve':
      return valveGuide(desk, of);
    case 'valve check':
      return valveCheckGuide(desk, of);
    case 'lick':
      return lickGuide(desk);
    case 'latency':
      return latencyGuide(desk);
  }
}
