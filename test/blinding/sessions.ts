import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { newKey, sealAllocation, slotFor } from '../../server/session/blinding/allocation.js';
import type { Blinding } from '../../server/session/blinding/arms.js';
import { recordedSession } from '../analysis/recorded.js';

export const RULES = `title: Blinded
belt: 180 cm
draws:
  arm: stim or sham, every session, sealed
phases:
  before: for 2 laps
  induction: until firings of induce this phase >= 4, at lap end
  probe: to the end
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
    limit: 1 per lap
  induce:
    when: reaches 45 cm
    if: phase is induction
    sham: arm is sham
    do: pulse gate for 300 ms
    limit: 1 per lap
    within: 1 cm
  flash:
    when: reaches 120 cm
    sham: arm is sham
    do:
      - pulse laser for 20 ms
      - pulse marker for 20 ms
    limit: 1 per lap
    within: 1 cm
end: laps done this session >= 10
`;

/** One sealed allocation, and a recorded session of each of its arms: the same but for the arm. */
export function blindedPair(rigExtra = '') {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-blinding-'));
  const file = join(folder, 'allocation.json');
  const keyFile = join(folder, 'allocation.key');
  const key = newKey();
  const about = { madeAt: '2026-03-01T12:00:00.000+00:00', by: 'kl', how: 'by a list' };
  const slots = ['stim', 'sham'].map((arm, n) => ({ subject: 'm07', session: n + 1, arm }));
  const allocation = sealAllocation(slots, key, about);
  writeFileSync(file, JSON.stringify(allocation));
  writeFileSync(keyFile, key, { mode: 0o600 });
  const session = (arm: string, number: number) => {
    const blinding: Blinding = {
      ...{ allocation: allocation.id, commitment: allocation.commitment, file, key: keyFile },
      slot: slotFor(allocation, 'm07', number),
    };
    const minutes = 12;
    return recordedSession({ rules: RULES, minutes, blinding, arm, rigExtra });
  };
  const stim = session('stim', 1);
  const sham = session('sham', 2);
  return {
    ...{ folder, file, keyFile, key, allocation, stim, sham },
    remove: () => {
      rmSync(folder, { recursive: true, force: true });
      stim.remove();
      sham.remove();
    },
  };
}
