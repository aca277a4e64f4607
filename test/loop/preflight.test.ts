import { afterEach, describe, expect, test } from 'vitest';
import { readDescription } from '../../server/session/description.js';
import { keepPreflight, type Preflight, preflightAgainst } from '../../server/session/preflight.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { LiveRig } from '../tools/liveRig.js';

let rig: LiveRig | undefined;
afterEach(() => rig?.stop());

const RULES = `title: Three laps
belt: 30 cm
rules:
  water:
    when: reaches 10 cm
    do: give 2 uL
end: lap > 3
`;

function preflightAt(madeAt: string, name: string, passed: boolean): Preflight {
  return {
    ...{ format: 1, rig: name, madeAt, by: 'KL', passed },
    board: { model: 'x', boardId: 1, simulated: false },
    checks: [
      { id: 'clock', title: 'Clock', result: 'passed', detail: '', remedy: '' },
      {
        ...{ id: 'seam', title: 'Seam mark', result: passed ? 'passed' : 'failed' },
        ...{ detail: 'none was seen', remedy: 'Clean the sensor.' },
      },
    ],
  };
}

const left = (child: ReturnType<LiveRig['run']>) =>
  new Promise<number | null>((resolve) => child.once('close', resolve));

describe('the pre-flight before a session', { timeout: 120_000 }, () => {
  test('that failed lets none begin without a reason, and the reason is kept', async () => {
    rig = await LiveRig.start({ rules: RULES });
    const file = readRig(rig.rigPath);
    const now = new Date();
    keepPreflight(file, preflightAt(now.toISOString(), file.name, false));
    expect(await left(rig.run())).not.toBe(0);
    expect(rig.output).toContain('PREFLIGHT_AGAINST');
    expect(rig.output).toMatch(/the pre-flight of \d\d:\d\d failed: seam mark/);

    const reason = 'the mark was seen by eye';
    expect(await left(rig.run('--despite', reason)), rig.output).toBe(0);
    const { preflightOverride, preflight } = readDescription(rig.session);
    expect(preflightOverride).toEqual({
      against: expect.stringMatching(/failed: seam mark$/),
      reason,
    });
    expect(preflight!.passed).toBe(false);
  });

  test('is wanted of a real board, passed and of today; of a simulated one only if it failed', async () => {
    rig = await LiveRig.start({ rules: RULES });
    const file = readRig(rig.rigPath);
    const now = new Date('2026-03-04T10:00:00Z');
    const against = (simulated: boolean) => preflightAgainst(file, simulated, now);
    expect(against(false)).toBe('no pre-flight of this rig was made in the last 12 hours');
    expect(against(true)).toBeUndefined();
    keepPreflight(file, preflightAt('2026-03-03T21:59:00Z', file.name, true));
    expect(against(false)).toMatch(/^no pre-flight/);
    keepPreflight(file, preflightAt('2026-03-04T08:00:00Z', 'another rig', true));
    expect(against(false)).toMatch(/^no pre-flight/);
    keepPreflight(file, preflightAt('2026-03-04T08:10:00Z', file.name, true));
    expect(against(false)).toBeUndefined();
    // The newest counts.
    keepPreflight(file, preflightAt('2026-03-04T09:00:00Z', file.name, false));
    expect(against(false)).toBe('the pre-flight of 09:00 failed: seam mark');
    expect(against(true)).toBe('the pre-flight of 09:00 failed: seam mark');
  });
});
