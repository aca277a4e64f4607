import { readdirSync, readFileSync, statSync, truncateSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { replaySession } from '../../server/session/replay.js';
import { SessionRunner } from '../../server/session/runner.js';
import { KeepAll, scratchFolder, setupOf, virtualRig } from './rehearsed.js';

const sessions = join(packageRoot, 'hardware-sim/demo/sessions');
const demo = readFileSync(join(sessions, 'demo.yaml'), 'utf8');
const MINUTE_US = 60_000_000;

/** A rehearsal of the demo's session, for this long, with everything kept. */
function demoKept(minutes: number, seed = 'one'): KeepAll {
  const kept = new KeepAll();
  rehearse(setupOf(demo, seed), virtualRig(), { mostUs: minutes * MINUTE_US, recorder: kept });
  return kept;
}

describe('the session core', () => {
  it('gives the same commands and decisions for the same inputs', () => {
    const kept = demoKept(5);
    const again = new KeepAll();
    const runner = new SessionRunner(setupOf(demo, 'one'), () => {}, again);
    for (const input of kept.inputs) {
      if (input.kind === 'sample') runner.sample(input.message);
      else runner.take(input);
    }
    expect(again.said).toEqual(kept.said);
    expect(kept.said.length).toBeGreaterThan(100);
  });

  it('gives other draws for another seed, and the same for the same', () => {
    const draws = (seed: string) =>
      demoKept(8, seed).decisions.flatMap((d) => (d.kind === 'drawn' ? [d.value] : []));
    expect(draws('one')).toEqual(draws('one'));
    const others = ['two', 'three', 'four', 'five'].map((seed) => draws(seed).join());
    expect(new Set(others).size).toBeGreaterThan(1);
  });

  it('killed at any input and fed its record again, goes on as its undisturbed twin', () => {
    const kept = demoKept(4);
    fc.assert(
      fc.property(fc.nat(kept.inputs.length - 1), (killedAt) => {
        const rest = new KeepAll();
        const runner = new SessionRunner(setupOf(demo, 'one'), () => {}, rest);
        const feed = (from: number, to: number) => {
          for (let i = from; i < to; i++) {
            const input = kept.inputs[i]!;
            if (input.kind === 'sample') runner.sample(input.message);
            else runner.take(input);
          }
        };
        runner.replay(() => feed(0, killedAt));
        feed(killedAt, kept.inputs.length);
        const expected = kept.said.filter((line) => Number(line.split(' ', 1)) >= killedAt);
        expect(rest.said).toEqual(expected);
      }),
      { seed: 21, numRuns: 12 },
    );
  });
});

describe('a recorded session', () => {
  async function recorded(rules: string, minutes: number, seed: string) {
    const where = scratchFolder();
    const header = { session: 's', startedAtMs: 0, software: 'test', seed };
    const recorder = Recorder.create(where.folder, header, { mode: 'bulk' });
    rehearse(setupOf(rules, seed), virtualRig(), { mostUs: minutes * MINUTE_US, recorder });
    recorder.close('done');
    return where;
  }

  it.each(readdirSync(sessions).filter((name) => name.endsWith('.yaml') && !name.startsWith('11')))(
    'of %s replays identically',
    async (name) => {
      const rules = readFileSync(join(sessions, name), 'utf8');
      const where = await recorded(rules, 4, name);
      const result = await replaySession(where.folder, setupOf(rules, name));
      expect(result.difference).toBeNull();
      expect(result.decisions).toBeGreaterThan(5);
      where.remove();
    },
  );

  it('tells the first difference and its cause when the rules were others', async () => {
    const where = await recorded(demo, 4, 'x');
    const others = setupOf(demo.replace('reaches 90 cm', 'reaches 91 cm'), 'x');
    const { difference } = await replaySession(where.folder, others);
    expect(difference).not.toBeNull();
    expect(difference!.recorded).toContain('"output":0');
    where.remove();
  });

  it('torn at any byte, replays identically up to where it was torn', async () => {
    const where = await recorded(demo, 1, 'y');
    const file = join(where.folder, 'record.mcap');
    const bytes = statSync(file).size;
    const cuts = fc.sample(fc.integer({ min: 200, max: bytes - 1 }), { seed: 5, numRuns: 12 });
    for (const cut of cuts.sort((a, b) => b - a)) {
      truncateSync(file, cut);
      const result = await replaySession(where.folder, setupOf(demo, 'y'));
      expect(result.difference, `cut at ${cut}`).toBeNull();
      expect(result.state.state).not.toBe('whole');
    }
    where.remove();
  });
});
