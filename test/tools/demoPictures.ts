/** `npm run screenshots`: runs the demo and takes the README's pictures of it. */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { packageRoot } from '../../server/packageRoot.js';
import { lapwing } from './liveRig.js';
import { takePictures } from './screenshot.js';

const LAPS = 9;

const folder = mkdtempSync(join(tmpdir(), 'lapwing-pictures-'));
const records = join(folder, 'records');
const demo = lapwing('demo', '--port', '0', '--records', records);
try {
  const url = await new Promise<string>((resolve, reject) => {
    let said = '';
    demo.stdout!.on('data', (bytes: Buffer) => {
      said += bytes.toString('utf8');
      const found = /Open (http\S+)/.exec(said);
      if (found) resolve(found[1]!);
    });
    demo.once('exit', (status) => reject(new Error(`the demo left with ${status}: ${said}`)));
  });
  const out = join(packageRoot, 'dashboard/screenshots');
  for (const file of await takePictures({ url, out, laps: LAPS })) console.log(file);
} finally {
  demo.kill('SIGINT');
  await new Promise((resolve) => demo.once('exit', resolve));
  rmSync(folder, { recursive: true, force: true });
}
