import { spawn } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { spawn as spawnAtTerminal } from '@lydell/node-pty';
import { afterAll, describe, expect, test } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { parseAnimal } from '../../server/rehearse/animalFile.js';
import { scratchFolder } from '../session/rehearsed.js';
import { WATER } from './setting.js';

const { folder, remove } = scratchFolder();
afterAll(remove);
const RULES = join(folder, 'rules.yaml');
writeFileSync(RULES, WATER);
const RIG = join(packageRoot, 'hardware-sim/demo/rig.yaml');
/** Whole processes, each of which starts threads: some seconds on a busy machine. */
const SLOW_MS = 120_000;
const MAIN = join(packageRoot, 'dist/server/main/main.js');

interface Ended {
  readonly status: number | null;
  readonly out: string;
  readonly err: string;
}

function lapwing(args: readonly string[]): Promise<Ended> {
  const child = spawn(process.execPath, [MAIN, ...args], { stdio: ['ignore', 'pipe', 'pipe'] });
  let out = '';
  let err = '';
  child.stdout.on('data', (data) => {
    out += data;
  });
  child.stderr.on('data', (data) => {
    err += data;
  });
  return new Promise((resolve) => {
    child.once('close', (status) => resolve({ status, out, err }));
  });
}

describe('lapwing rehearse --runs', () => {
  const many = ['rehearse', RULES, '--rig', RIG, '--runs', '4', '--seed', 'same', '--jobs', '2'];

  test(
    'prints one table, and the same facts as JSON',
    async () => {
      const words = await lapwing(many);
      expect(words.status).toBe(0);
      expect(words.out).toMatch(/^water: 4 sessions, seed same, animal usual, trained\n/);
      expect(words.out).toMatch(/^laps +6 +6 +6$/m);
      expect(words.out).toMatch(/^water fired +5 +5 +5$/m);
      expect(words.out).toMatch(/^Latency of what the host decides: not measured here/m);
      const json = JSON.parse((await lapwing([...many, '--json'])).out);
      expect(json).toMatchObject({ runs: 4, seed: 'same', laps: { median: 6 } });
    },
    SLOW_MS,
  );

  test(
    'ends at once on Ctrl-C, with nothing on its output',
    async () => {
      const endless = many.map((word) => (word === '4' ? '10000' : word));
      const terminal = spawnAtTerminal(process.execPath, [MAIN, ...endless], {});
      let shown = '';
      let pressed = false;
      terminal.onData((data) => {
        shown += data;
        // The bar says that it has begun.
        if (!pressed && shown.includes('rehearsing 10000 sessions [')) {
          pressed = true;
          terminal.write('\x03');
        }
      });
      const { exitCode } = await new Promise<{ exitCode: number }>((resolve) => {
        terminal.onExit(resolve);
      });
      expect(exitCode).toBe(130);
      expect(shown).toMatch(/cancelled\r\n$/);
      expect(shown).not.toContain('median');
    },
    SLOW_MS,
  );

  test(
    'says what cannot go together, and what file it could not read',
    async () => {
      const [both, none] = await Promise.all([
        lapwing([...many, '--events']),
        lapwing([...many, '--animal', join(folder, 'none.yaml')]),
      ]);
      expect(both.status).toBe(1);
      expect(both.err).toMatch(/'--runs <number>' cannot be used with option '--events'/);
      expect(none.status).toBe(1);
      expect(none.err).toContain('REHEARSE_ANIMAL_BAD');
    },
    SLOW_MS,
  );
});

describe('lapwing animal', () => {
  test(
    'fits a record, and what it writes is an animal to rehearse with',
    async () => {
      const rules = join(folder, 'long.yaml');
      writeFileSync(rules, WATER.replace('lap >= 6', 'time >= 8 min'));
      const made = await lapwing(['rehearse', rules, '--rig', RIG, '--record', folder]);
      const record = /record: (.*)/.exec(made.out)![1]!;
      const to = join(folder, 'mine.yaml');
      const fit = await lapwing(['animal', 'fit', record, '--name', 'mine', '--to', to]);
      expect(fit.err).toBe('');
      expect(fit.out).toMatch(/mine\.yaml: \d+ of \d+ parameters fitted/);
      const text = readFileSync(to, 'utf8');
      const { animal, problems } = parseAnimal(text);
      expect(problems).toEqual([]);
      expect(animal!.name).toBe('mine');
      expect(animal!.parameters.fastestLickHz).toBeGreaterThan(7);
      expect(text).toMatch(/# As usual, not fitted: .*between_animals/);
      const again = await lapwing([
        ...[
          'rehearse',
          RULES,
          '--rig',
          RIG,
          '--runs',
          '2',
          '--seed',
          'x',
          '--animal',
          to,
          '--json',
        ],
      ]);
      expect(JSON.parse(again.out).animal).toBe('mine, trained');
    },
    SLOW_MS,
  );
});

describe('lapwing plan power', () => {
  test(
    'tells animals for each number of laps',
    async () => {
      const args = ['plan', 'power', RULES, '--rig', RIG, '--difference', '20%', '--laps', '4,8'];
      const more = ['--runs', '24', '--seed', 'p', '--json'];
      const plan = JSON.parse((await lapwing([...args, ...more])).out);
      expect(plan).toMatchObject({ design: 'between', difference: 0.2, seed: 'p' });
      expect(plan.rows.map(({ laps }: { laps: number }) => laps)).toEqual([4, 8]);
      for (const { animals } of plan.rows) expect(animals).toBeGreaterThan(1);
    },
    SLOW_MS,
  );

  test(
    'says what a share is',
    async () => {
      const { status, err } = await lapwing([
        ...['plan', 'power', RULES, '--rig', RIG, '--difference', 'much'],
      ]);
      expect(status).toBe(1);
      expect(err).toMatch(/expected a share from 0\.1% to 100%/);
    },
    SLOW_MS,
  );
});
