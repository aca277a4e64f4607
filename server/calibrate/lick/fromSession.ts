import { readRecord } from '../../session/record/readRecord.js';
import type { Rig } from '../../session/rig/rig.js';
import { OUTCOME } from '../../wire/messages.js';
import { extend32 } from '../../wire/time.js';
import type { Draft } from '../guides/guide.js';
import { lickDraft } from '../guides/lickGuide.js';
import type { LickEdge } from './contacts.js';

/** The lick sensor as a session's record shows it: every raw edge is kept there. */
export async function lickFromSession(folder: string, rig: Rig): Promise<Draft> {
  const reader = await readRecord(folder);
  const edges: LickEdge[] = [];
  const changesUs = new Map<string, number[]>();
  let nowUs = 0;
  const at = (boardUs: number) => {
    nowUs = Math.max(nowUs, extend32(nowUs, boardUs));
    return extend32(nowUs, boardUs);
  };
  let fromUs = Number.NaN;
  reader.visit({
    input: (_, input) => {
      if (input.kind === 'edge') {
        const { boardUs, input: line, level } = input.message;
        const atUs = at(boardUs);
        if (Number.isNaN(fromUs)) fromUs = atUs;
        if (line === rig.lick?.line) edges.push({ atUs, level: level === 1 ? 1 : 0 });
      } else if (input.kind === 'outcome') {
        const { kind, output, boardUs, repeated } = input.message;
        if (repeated !== 0 || (kind !== OUTCOME.fired && kind !== OUTCOME.done)) return;
        const name = rig.outputs.find(({ line }) => line === output)?.name ?? String(output);
        changesUs.set(name, [...(changesUs.get(name) ?? []), at(boardUs)]);
      }
    },
  });
  return lickDraft(rig, { edges, changesUs, spanUs: nowUs - fromUs }, undefined);
}
