import { copyFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, expect, it } from 'vitest';
import { DEMO_SESSIONS, makeDemoSession } from '../../server/main/demoSessions.js';
import { packageRoot } from '../../server/packageRoot.js';
import { readDescription } from '../../server/session/description.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { scratchFolder } from './rehearsed.js';

const where = scratchFolder();
afterAll(() => where.remove());

it('an earlier session of the demo is made with a copy of its rig file that lies elsewhere', async () => {
  const rig = join(where.folder, 'rig.yaml');
  copyFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), rig);
  const demo = { ...DEMO_SESSIONS.at(-1)!, minutes: 1 };
  const folder = await makeDemoSession(where.folder, readRig(rig), demo, 3);
  const { subject, sessionNumber, ended, replay } = readDescription(folder);
  expect({ subject, sessionNumber }).toEqual({ subject: 'sim1', sessionNumber: 3 });
  expect(ended).not.toBeNull();
  expect(replay?.identical).toBe(true);
});
