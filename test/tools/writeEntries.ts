/**
 * One rig of several that write to an animals folder at once: `node writeEntries.js FOLDER COMPUTER
 * CLOCK_AHEAD_MS COUNT`. Writes COUNT weights of m31, 0.001 g apart, and prints a line for each that
 * is safely there.
 */
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';

const [, , folder, computer, aheadMs, count] = process.argv;
const now = () => new Date(Date.now() + Number(aheadMs));
const animals = new AnimalsFolder(folder!, now, computer!);
for (let n = 1; n <= Number(count); n++) {
  const grams = Math.round(20_000 + n) / 1_000;
  const at = now().toISOString();
  const entry = await animals.add('m31', { kind: 'weight', at, grams }, computer!);
  process.stdout.write(`${entry.id}\n`);
}
