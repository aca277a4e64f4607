import { setFlagsFromString } from 'node:v8';
import { runInNewContext } from 'node:vm';
import { rehearse } from '../../server/session/rehearsal.js';
import { setupOf, virtualRig } from '../session/rehearsed.js';

const HOURS = 8;
const HOUR_US = 3.6e9;
const RULES = `title: Eight hours
belt: 180 cm
draws:
  kind: stim or sham, every firing of light, in shuffled blocks of 10
rules:
  water:
    when: reaches 90 cm
    do: give 1 uL
  light:
    when: reaches 45 cm
    if: mean speed over the last 1 s >= 5 cm/s and licks over the last 3 laps >= 0
    sham: kind is sham
    do: pulse laser for 20 ms
    limit: 1 per lap, 20 per 10 min
  third:
    when: 3rd lick this lap
    do: pulse marker for 5 ms
end: time >= 8 h
`;

export interface MemoryBench {
  /** Heap in use after a full collection, MB, at the end of each hour of virtual session. */
  readonly heapMB: readonly number[];
}

/** What the loop's memory does over eight hours of session: it should be flat. */
export function benchMemory(): MemoryBench {
  setFlagsFromString('--expose-gc');
  const collect = runInNewContext('gc') as () => void;
  const heapMB: number[] = [];
  rehearse(setupOf(RULES), virtualRig(), {
    mostUs: (HOURS + 1) * HOUR_US,
    progress: (sessionUs) => {
      if (sessionUs % HOUR_US < 60e6 && heapMB.length < Math.floor(sessionUs / HOUR_US)) {
        collect();
        heapMB.push(process.memoryUsage().heapUsed / 1e6);
      }
      return false;
    },
  });
  return { heapMB };
}
