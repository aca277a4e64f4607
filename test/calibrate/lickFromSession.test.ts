import { mkdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { lickFromSession } from '../../server/calibrate/lick/fromSession.js';
import { packageRoot } from '../../server/packageRoot.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { demoRig, scratchFolder, setupOf, virtualRig } from '../session/rehearsed.js';

const { folder, remove } = scratchFolder();
afterAll(remove);
const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/sessions/demo.yaml'), 'utf8');

function recorded(name: string, minutes: number): string {
  const where = join(folder, name);
  mkdirSync(where);
  const header = { session: 's', startedAtMs: 0, software: 'test', seed: 'x' };
  const recorder = Recorder.create(where, header, { mode: 'bulk' });
  rehearse(setupOf(demo), virtualRig({ lickBounces: 2 }), {
    mostUs: minutes * 60_000_000,
    recorder,
  });
  recorder.close('done');
  return where;
}

describe("the lick sensor from a session's record", () => {
  it('has lockout and limits from its raw edges, and the echoes of every output that was driven', async () => {
    const draft = await lickFromSession(recorded('long', 6), demoRig);
    // The simulated sensor's bounces end within 2 ms; licks come at 5.5 to 8.5 Hz.
    const lockoutUs = Number(draft.values.lockoutUs);
    expect(lockoutUs).toBeGreaterThanOrEqual(10_000);
    expect(lockoutUs).toBeLessThanOrEqual(80_000);
    expect(Number(draft.values.lickHz)).toBeGreaterThan(5);
    expect(Number(draft.values.lickHz)).toBeLessThan(9);
    expect(draft.says.join()).toMatch(
      /valve: \d+ onsets within the artefact window of \d+ changes/,
    );
    expect(draft.usable).toBe(true);
  });

  it('says how much too little there was of it', async () => {
    const elsewhere = { ...demoRig, lick: { ...demoRig.lick!, line: 3 } };
    await expect(lickFromSession(join(folder, 'long'), elsewhere)).rejects.toThrow(
      '0 contacts were seen, and 50 are needed',
    );
  });
});
