import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import type { Actor, OperatorAct } from '../../server/session/inputs.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { SessionRunner } from '../../server/session/runner.js';
import { KeepAll, setupOf, virtualRig } from './rehearsed.js';

const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/sessions/demo.yaml'), 'utf8');
const MINUTE_US = 60_000_000;

/** Three minutes of the demo, in which the controls change hands so often a minute. */
function session(changes: number): KeepAll {
  const kept = new KeepAll();
  let runner!: SessionRunner;
  rehearse(setupOf(demo), virtualRig(), {
    mostUs: 3 * MINUTE_US,
    recorder: kept,
    began: (one) => {
      runner = one;
    },
    progress: () => {
      for (let n = 0; n < changes; n++) {
        const act: OperatorAct = { act: 'controls', holder: n % 2 ? 'anna' : 'ben', before: null };
        const by: Actor = { who: 'ben', from: 'dashboard 10.0.0.7' };
        runner.take({ kind: 'operator', act, by });
      }
      return false;
    },
  });
  return kept;
}

/** What was sent and decided, without the numbers of the inputs. */
function decided({ said }: KeepAll): string[] {
  return said
    .map((line) => line.replace(/^\d+ /, '').replace(/"input":\d+,?/, ''))
    .filter((line) => !line.includes('"kind":"operator"'));
}

describe('the controls that change hands', () => {
  const handed = session(3);

  it('are in the record, in order, with who and from where', () => {
    const told = handed.decisions.filter((one) => one.kind === 'operator');
    expect(told.length).toBeGreaterThanOrEqual(6);
    expect(told[1]).toMatchObject({
      ...{ who: 'ben', from: 'dashboard 10.0.0.7' },
      act: { act: 'controls', holder: 'anna', before: null },
    });
  });

  it('change nothing that is decided or sent', () => {
    const alone = decided(session(0));
    expect(alone.length).toBeGreaterThan(100);
    expect(decided(handed)).toEqual(alone);
  });

  it('are replayed like any other input', () => {
    const again = new KeepAll();
    const runner = new SessionRunner(setupOf(demo), () => {}, again);
    for (const input of handed.inputs) {
      if (input.kind === 'sample') runner.sample(input.message);
      else runner.take(input);
    }
    expect(again.said).toEqual(handed.said);
  });
});
