import { readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import type { Snapshot } from '../../server/loop/protocol.js';
import { readDescription } from '../../server/session/description.js';
import { finished, LiveRig, lapwing } from '../tools/liveRig.js';

const RULES = `title: Blinded
belt: 30 cm
draws:
  arm: stim or sham, every session, sealed
rules:
  induce:
    when: reaches 15 cm
    sham: arm is sham
    do: pulse gate for 50 ms
    limit: 1 per lap
    within: 1 cm
  water:
    when: reaches 25 cm
    do: give 4 uL
    within: 1 cm
end: laps done this session >= 4
`;
/** Output 1 of the test's rig, as the setup lists it. */
const GATE = 1;

let rig: LiveRig | undefined;
afterEach(async () => {
  await rig?.stop();
  rig = undefined;
});

const told = async (...args: string[]) => {
  const { status, out, err } = await finished(lapwing(...args));
  return { status, out, said: out + err };
};

describe('blinded sessions on a real pseudo-terminal', { timeout: 240_000 }, () => {
  it('look alike on the status line, in events and in state, and are opened by the key alone', async () => {
    rig = await LiveRig.start({
      rules: RULES,
      rigMore: 'blinding:\n  allocation: study.json\n  key: study.key\n',
    });
    // Refused while there is no allocation, and no session folder is left behind.
    const none = await finished(rig.run());
    expect(none.status).not.toBe(0);
    expect(none.err).toMatch(/BLINDING_BAD/);

    const at = (name: string) => join(rig!.folder, name);
    writeFileSync(at('list.csv'), 'm1,1,sham\nm1,2,stim\n');
    const sealing = ['--list', at('list.csv'), '--key', at('study.key'), '--by', 'kl', '--json'];
    const sealed = await told('seal', at('study.json'), ...sealing);
    expect(sealed.status, sealed.said).toBe(0);
    const { commitment } = JSON.parse(sealed.out) as { commitment: string };
    expect(statSync(at('study.key')).mode & 0o077).toBe(0);
    expect(readFileSync(at('study.json'), 'utf8')).not.toMatch(/"arm"/);

    rig.watch();
    const shown: Record<string, unknown>[] = [];
    const rises: number[] = [];
    for (const _ of ['sham', 'stim']) {
      const before = await rig.rises(GATE);
      const from = rig.events.length;
      rig.output = '';
      const states: Snapshot[] = [];
      const looking = setInterval(() => rig!.state && states.push(rig!.state), 20);
      const { status } = await finished(rig.run());
      clearInterval(looking);
      expect(status, rig.output).toBe(0);
      rises.push((await rig.rises(GATE)) - before);
      const events = rig.events.slice(from);
      const own = events.filter((one) => 'rule' in one && one.rule === 'induce');
      const running = states.filter(({ session }) => session === 'running');
      shown.push({
        kinds: [...new Set(own.map(({ kind }) => kind))],
        fired: own.map(
          (one) => one.kind === 'fired' && [one.sham, one.armed, one.output, one.riseUs],
        ),
        drawn: events.flatMap((one) => (one.kind === 'drawn' ? [one.value] : [])),
        output: [...rig.output.matchAll(/induce[^\n]*/g)].map(([line]) => line.replace(/\d/g, '')),
        gateSeen: running.some(({ outputs }) => (outputs & (1 << GATE)) !== 0),
        rule: running
          .map(({ rules }) => rules.find(({ name }) => name === 'induce')!)
          .filter(({ armed, shams }) => armed || shams > 0).length,
      });
    }
    // The board itself was driven in one of them and not in the other.
    expect(rises[0]).toBe(0);
    expect(rises[1]).toBeGreaterThanOrEqual(3);
    expect(shown[0]!.kinds).toEqual(['fired']);
    expect(shown[0]!.drawn).toEqual(['sealed']);
    expect(shown[0]!.gateSeen).toBe(false);
    expect(shown[0]!.rule).toBe(0);
    expect({ ...shown[0], output: 0, fired: 0 }).toEqual({ ...shown[1], output: 0, fired: 0 });
    for (const { fired } of shown) {
      for (const one of fired as unknown[]) expect(one).toEqual([false, false, 'gate', null]);
    }
    const lines = new Set(shown.flatMap(({ output }) => output as string[]));
    expect([...lines].filter((line) => /sham|asked|armed/.test(line))).toEqual([]);

    const folders = readdirSync(rig.recordFolder).sort().slice(-2);
    const [sham, stim] = folders.map((name) => join(rig!.recordFolder, name));
    for (const folder of [sham!, stim!]) {
      const { blinding, replay } = readDescription(folder);
      expect(blinding).toMatchObject({ commitment, slot: { subject: 'm1' } });
      expect(replay!.identical).toBe(true);
    }
    const opened = await told('unblind', stim!, '--reason', 'the study is over', '--json');
    expect(JSON.parse(opened.out)).toMatchObject({ arm: 'stim', reason: 'the study is over' });
    const all = await told(
      'unblind',
      at('study.json'),
      '--key',
      at('study.key'),
      '--reason',
      'end',
    );
    expect(all.said).toMatch(/m1 +session 1 +sham/);
    expect(all.said).toContain(commitment);
    const log = readFileSync(at('study.json.openings.jsonl'), 'utf8').trim().split('\n');
    expect(log).toHaveLength(2);
  });
});
