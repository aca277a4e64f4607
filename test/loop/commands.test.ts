import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { finished, LiveRig, lapwing } from '../tools/liveRig.js';
import { PtyRig } from '../tools/ptyRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-commands-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const demoRig = join(packageRoot, 'hardware-sim/demo/rig.yaml');
const demoRules = join(packageRoot, 'hardware-sim/demo/sessions/demo.yaml');

function file(name: string, text: string): string {
  const path = join(folder, name);
  writeFileSync(path, text);
  return path;
}

async function run(...args: string[]) {
  const { status, out, err } = await finished(lapwing(...args));
  return { status, said: out + err };
}

const GOOD =
  'title: good\nbelt: 180 cm\nrules:\n  water:\n    when: reaches 90 cm\n    do: give 4 uL\n';

describe('a rules file with three mistakes', { timeout: 60_000 }, () => {
  const path = file(
    'three.yaml',
    `title: three mistakes
belt: 180 cm
rules:
  water:
    when: reachs 90 cm
    do: give 4
  light:
    when: reaches 45 cm
    do: pulse lazer for 10 ms
end: time >= 60 min
`,
  );

  it('is told all three at once, each with its place, its words and what was expected', async () => {
    const { status, said } = await run('check', path, '--rig', demoRig);
    expect(status).toBe(1);
    expect(said).toContain('three.yaml:5:11');
    expect(said).toContain('three.yaml:6:');
    expect(said).toContain('three.yaml:9:');
    expect(said).toMatch(/reaches/);
    expect(said).toMatch(/unit/);
    expect(said).toMatch(/laser/);
    expect(said).toMatch(/3 errors/);
  });

  it('is told to a program as JSON', async () => {
    const { status, out } = await finished(lapwing('check', path, '--rig', demoRig, '--json'));
    expect(status).toBe(1);
    const problems = JSON.parse(out) as { severity: string; at: { from: { line: number } } }[];
    const errors = problems.filter(({ severity }) => severity === 'error');
    expect(errors.map(({ at }) => at.from.line)).toEqual([5, 6, 9]);
  });

  it('is not run', async () => {
    const { status, said } = await run('run', path, '--rig', demoRig, '--records', folder);
    expect(status).toBe(1);
    expect(said).toContain('RULES_INVALID');
  });
});

describe('what cannot be read or opened is told with its code and the remedy', {
  timeout: 90_000,
}, () => {
  it('a rig file that is not there', async () => {
    const { status, said } = await run('run', demoRules, '--rig', join(folder, 'none.yaml'));
    expect(status).toBe(1);
    expect(said).toContain('RIG_UNREADABLE');
    expect(said).toContain('--rig');
  });

  it('a rig file with an unknown key, by line and column', async () => {
    const rig = file('rig-key.yaml', readFileSync(demoRig, 'utf8').replace('belt:', 'bellt:'));
    const { status, said } = await run('check', demoRules, '--rig', rig);
    expect(status).toBe(1);
    expect(said).toContain('RIG_INVALID');
    expect(said).toMatch(/rig-key\.yaml:\d+:1: unknown key `bellt`/);
  });

  it('a rules file that is not there', async () => {
    const { status, said } = await run('check', join(folder, 'none.yaml'), '--rig', demoRig);
    expect(status).toBe(1);
    expect(said).toContain('none.yaml');
    expect(said).toContain('cannot be read');
  });

  it('a belt that is another length than the rig has', async () => {
    const rules = file('belt.yaml', GOOD.replace('180 cm', '150 cm'));
    const { status, said } = await run('check', rules, '--rig', demoRig);
    expect(status).toBe(1);
    expect(said).toContain('belt.yaml:2:7');
    expect(said).toContain('180 cm');
  });

  it('a port that does not exist', async () => {
    const rig = file(
      'rig-port.yaml',
      readFileSync(demoRig, 'utf8')
        .replace('port: simulated', 'port: /dev/ttyLAPWING9')
        .replace('rig: demo', `rig: no port ${process.pid}`),
    );
    const { status, said } = await run(
      'run',
      file('good.yaml', GOOD),
      '--rig',
      rig,
      '--records',
      folder,
    );
    expect(status).not.toBe(0);
    expect(said).toContain('LINK_PORT_MISSING');
    expect(said).toContain('lapwing ports');
  });

  it('a port that another program holds, and that program is left alone', async () => {
    const rig = await LiveRig.start({
      rules: GOOD.replace('180 cm', '30 cm').replace('90 cm', '20 cm'),
    });
    const holder = rig.run();
    rig.watch();
    const { until } = await import('../tools/liveRig.js');
    await until(
      'the first to run',
      () => rig.state?.session === 'running',
      60_000,
      () => rig.output,
    );
    // Another rig file for the same port: another lock, the same device.
    const other = file(
      'rig-busy.yaml',
      readFileSync(rig.rigPath, 'utf8').replace(/^rig: .*/m, `rig: busy ${process.pid}`),
    );
    const { status, said } = await run('run', rig.rulesPath, '--rig', other, '--records', folder);
    expect(status).not.toBe(0);
    expect(said).toContain('LINK_PORT_BUSY');
    expect(holder.exitCode).toBeNull();
    expect(rig.state!.link.state).toBe('up');
    await rig.end('SIGINT');
    await rig.stop();
  });

  it('a board that never answers', async () => {
    const silent = await PtyRig.start(['--tcp', '0']);
    await silent.say('stall 20000');
    const rig = file(
      'rig-silent.yaml',
      readFileSync(demoRig, 'utf8')
        .replace('port: simulated', `port: ${silent.port}`)
        .replace('rig: demo', `rig: silent ${process.pid}`),
    );
    const { status, said } = await run(
      'run',
      file('good.yaml', GOOD),
      '--rig',
      rig,
      '--records',
      folder,
    );
    expect(status).not.toBe(0);
    expect(said).toContain('LINK_NO_ANSWER');
    await silent.stop();
  });
});

describe('a rehearsal', { timeout: 60_000 }, () => {
  it('tells what fired where, how much water, and what ended it', async () => {
    const { status, said } = await run('rehearse', demoRules, '--rig', demoRig, '--most', '10');
    expect(status).toBe(0);
    expect(said).toMatch(/water: fired \d+; \d+ started by the board, 0\.00 mm from the place/);
    expect(said).toMatch(/uL of water/);
    expect(said).toContain('ended: ');
  });

  it('gives the same summary for the same seeds', async () => {
    const args = ['rehearse', demoRules, '--rig', demoRig, '--most', '5', '--seed', 'x', '--json'];
    const [one, two] = [await finished(lapwing(...args)), await finished(lapwing(...args))];
    expect(one.out).toBe(two.out);
    expect(JSON.parse(one.out)).toHaveProperty('rules.water.fired');
  });
});
