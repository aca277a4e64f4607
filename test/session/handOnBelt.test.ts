import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { readRig } from '../../server/session/rig/readRig.js';
import type { Rig } from '../../server/session/rig/rig.js';
import { SessionRunner } from '../../server/session/runner.js';
import { demoRig, KeepAll, setupOf, virtualRig } from './rehearsed.js';

const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/sessions/demo.yaml'), 'utf8');
const MINUTE_US = 60_000_000;

/** Six minutes of the demo; from the second to the fourth a hand turns the belt, either way. */
function handled(rig: Rig = demoRig) {
  const kept = new KeepAll();
  const virtual = virtualRig();
  const { simulated } = virtual;
  const rises: number[] = [];
  let minute = 0;
  let runner!: SessionRunner;
  rehearse(setupOf(demo, 'one', rig), virtual, {
    mostUs: 6 * MINUTE_US,
    recorder: kept,
    began: (one) => {
      runner = one;
    },
    progress: () => {
      minute++;
      const by = { who: 'a test', from: 'here' };
      const hand = (on: boolean) =>
        runner.take({ kind: 'operator', act: { act: 'hand on belt', on }, by });
      if (minute === 2) hand(true);
      if (minute === 4) hand(false);
      simulated.forcedCmPerS = minute === 2 ? 25 : minute === 3 ? -12 : undefined;
      rises.push(simulated.rises.slice(0, 5).reduce((a, b) => a + b, 0));
      return false;
    },
  });
  const at = (n: number) => kept.decisions.filter((one) => one.kind === 'operator')[n]!.boardUs;
  const [onUs, offUs] = [at(0), at(1)];
  const during = kept.decisions.filter((one) => one.boardUs > onUs && one.boardUs < offUs);
  const after = kept.decisions.filter((one) => one.boardUs >= offUs);
  const before = kept.decisions.filter((one) => one.boardUs < onUs);
  return { kept, runner, rises, before, during, after, rig };
}

const lastLap = (told: readonly StampedDecision[]) =>
  told.flatMap((one) => (one.kind === 'lap began' ? [one.lap] : [])).at(-1)!;

describe('a hand on the belt', () => {
  const session = handled();

  it('lets nothing count and nothing fire while it turns the belt', () => {
    const { before, during, rises } = session;
    expect(before.some(({ kind }) => kind === 'fired')).toBe(true);
    expect(before.some(({ kind }) => kind === 'lick')).toBe(true);
    const kinds = new Set(during.map(({ kind }) => kind));
    for (const kind of ['fired', 'asked', 'armed', 'lick', 'lap began', 'seam', 'drawn'] as const) {
      expect(kinds, kind).not.toContain(kind);
    }
    // By the board's own pins, whatever the host believes.
    expect(rises[3]! - rises[1]!).toBe(0);
    expect(rises[1]!).toBeGreaterThan(0);
  });

  it('leaves position unknown until the next mark, which begins the next lap', () => {
    const { before, after } = session;
    const first = after.find((one) => one.kind === 'seam' || one.kind === 'trust')!;
    const known = after.find((one) => one.kind === 'seam');
    expect(known).toMatchObject({ event: 'first' });
    const blind = after.filter((one) => one.boardUs < known!.boardUs);
    expect(blind.filter(({ kind }) => kind === 'fired' || kind === 'armed')).toEqual([]);
    expect(first.positionCm).toBeNull();
    expect(after.find((one) => one.kind === 'lap began')).toMatchObject({
      lap: lastLap(before) + 1,
    });
  });

  it('lets the session go on afterwards as before', () => {
    const { after, runner } = session;
    expect(after.some((one) => one.kind === 'fired')).toBe(true);
    expect(runner.core.handOnBelt).toBe(false);
    expect(runner.core.holds.reason('water')).toBeNull();
    expect(runner.core.holds.reason('stimulus')).toBeNull();
  });

  it('is an input like any other: the same inputs give the same decisions', () => {
    const again = new KeepAll();
    const runner = new SessionRunner(setupOf(demo, 'one'), () => {}, again);
    for (const input of session.kept.inputs) {
      if (input.kind === 'sample') runner.sample(input.message);
      else runner.take(input);
    }
    expect(again.said).toEqual(session.kept.said);
  });

  it('on a belt without a mark, leaves the belt at 0 cm', () => {
    const path = join(packageRoot, 'hardware-sim/demo/rig.yaml');
    const { seam: _, ...belt } = readRig(path).belt;
    const { after, during } = handled({ ...demoRig, belt: { ...belt, seam: undefined } });
    expect(during.some((one) => one.kind === 'lap began')).toBe(false);
    const trust = after.find((one) => one.kind === 'trust' && one.trust === 'trusted');
    expect(trust).toMatchObject({ positionCm: 0 });
    expect(after.find((one) => one.kind === 'lap began')).toBeDefined();
  });
});
