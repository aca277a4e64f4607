/** A session on the brisk rig is the one that a board at 1 kHz would have seen. */
import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import type { SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import { simulatedRigFor } from '../../server/main/simulatedRigFor.js';
import { packageRoot } from '../../server/packageRoot.js';
import type { SessionSetup } from '../../server/session/core/sessionCore.js';
import { prepareRules } from '../../server/session/prepare.js';
import { rehearse, type VirtualRig } from '../../server/session/rehearsal.js';
import type { Rig } from '../../server/session/rig/rig.js';
import { demoRig, setupOf, virtualRig } from './rehearsed.js';

const REPORT_US = 20_000;
const SESSIONS = join(packageRoot, 'hardware-sim/demo/sessions');

const ARMED = `title: armed
belt: 180 cm
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  light:
    when: reaches 45 cm
    do: pulse laser for 50 ms
  late:
    when: reaches 170 cm
    do: pulse gate for 100 ms
`;
const ARMED_AND_NOT = `${ARMED}  both:
    when: reaches 20 cm
    do:
      - pulse laser for 5 ms
      - pulse tone for 5 ms
`;

interface Fired {
  readonly what: string;
  readonly us: number;
  readonly cm: number;
}

/** The same animal on both, so that what differs is how often the board reports. */
function firingsOf(setup: SessionSetup, brisk: boolean, minutes: number, options = {}): Fired[] {
  const given: SimulatedRigOptions = { strideUs: REPORT_US, seed: 3, ...options };
  const rig = virtualRig(brisk ? { ...given, board: { reportUs: REPORT_US } } : given);
  const { simulated } = rig;
  const told: VirtualRig = {
    get nowUs() {
      return simulated.nowUs;
    },
    reentrant: true,
    advanceTo: rig.advanceTo,
    connect: rig.connect,
    receive: rig.receive,
    ...(brisk ? { lookAt: (up, down, us) => simulated.lookAt(up, down, us) } : {}),
  };
  const fired: Fired[] = [];
  rehearse(setup, told, {
    mostUs: minutes * 60e6,
    onDecision: (d) => {
      if (d.kind !== 'fired') return;
      const what = `${d.rule} lap ${d.lap} ${d.output} ${d.sham ? 'sham' : ''}`;
      fired.push({ what, us: d.riseUs ?? d.boardUs, cm: d.riseCm ?? Number.NaN });
    },
  });
  return fired;
}

describe('a board that reports 50 times a second and where rules wait', () => {
  test('starts armed rules at the very microsecond and count', () => {
    const setup = setupOf(ARMED);
    const often = firingsOf(setup, false, 12);
    expect(firingsOf(setup, true, 12)).toEqual(often);
    expect(often.length).toBeGreaterThan(100);
  });

  // In the yoked session the host gives the water: a drop some milliseconds earlier, and the animal
  // itself goes on otherwise, so that only the order of its firings can be compared.
  const YOKED = '11-yoked-control.yaml';
  const files = readdirSync(SESSIONS).filter((name) => name.endsWith('.yaml'));
  test.each(files)('fires what %s would, in the same order, within 45 ms and 2 mm', (name) => {
    const { program, file } = prepareRules(join(SESSIONS, name), demoRig);
    const setup = { rig: demoRig, program, title: file.title, seed: 'same', waterTodayNl: 0 };
    const often = firingsOf(setup, false, 4);
    const seldom = firingsOf(setup, true, 4);
    expect(seldom.map(({ what }) => what)).toEqual(often.map(({ what }) => what));
    if (name === YOKED) return;
    for (const [n, { us, cm }] of seldom.entries()) {
      expect(Math.abs(us - often[n]!.us)).toBeLessThanOrEqual(45_000);
      if (!Number.isNaN(cm)) expect(Math.abs(cm - often[n]!.cm)).toBeLessThanOrEqual(0.2);
    }
  });

  const watching = (moment: string) =>
    setupOf(`title: speed
belt: 180 cm
rules:
  fast:
    when: ${moment}
    do: note
`);

  test('sees a speed that lasts at most 20 ms later', () => {
    const setup = watching('speed > 15 cm/s for 500 ms');
    const often = firingsOf(setup, false, 6);
    const seldom = firingsOf(setup, true, 6);
    expect(often.length).toBeGreaterThan(20);
    expect(Math.abs(seldom.length - often.length)).toBeLessThanOrEqual(often.length * 0.1);
    const near = seldom.filter(({ us }) => often.some((o) => us >= o.us && us - o.us <= 21_000));
    expect(near.length / seldom.length).toBeGreaterThan(0.9);
  });

  test('sees fewer crossings of a speed that hovers, none that was not there', () => {
    const setup = watching('speed > 25 cm/s');
    const often = firingsOf(setup, false, 4);
    const seldom = firingsOf(setup, true, 4);
    expect(seldom.length).toBeGreaterThan(5);
    expect(seldom.length).toBeLessThanOrEqual(often.length);
    for (const { us } of seldom) {
      const latest = often.findLast((fired) => fired.us <= us)!;
      expect(us - latest.us).toBeLessThanOrEqual(2 * REPORT_US);
    }
  });
});

describe('the simulated rig of a rig file', () => {
  const run = (rig: Rig): Fired[] => {
    const fired: Fired[] = [];
    rehearse(
      setupOf(ARMED_AND_NOT, 'a seed', rig),
      simulatedRigFor(rig, { seed: 2, trained: true }),
      {
        mostUs: 5 * 60e6,
        onDecision: (d) => {
          if (d.kind !== 'fired') return;
          fired.push({ what: `${d.rule} lap ${d.lap}`, us: d.riseUs!, cm: d.riseCm! });
        },
      },
    );
    return fired;
  };

  test('fires the same at the same places where the encoder counts down', () => {
    const reversed = { ...demoRig, belt: { ...demoRig.belt, reversed: true } };
    const forwards = run(demoRig);
    const backwards = run(reversed);
    expect(forwards.length).toBeGreaterThan(10);
    expect(backwards.map(({ what }) => what)).toEqual(forwards.map(({ what }) => what));
    // A falling count is met a count further on.
    for (const [n, { cm }] of backwards.entries()) expect(cm).toBeCloseTo(forwards[n]!.cm, 0);
  });

  test('has no seam mark where the rig has none', () => {
    const rig = { ...demoRig, belt: { ...demoRig.belt, seam: undefined } };
    const virtual = simulatedRigFor(rig, { seed: 2, trained: true });
    expect(virtual.simulated.belt.parameters.mark).toBe(false);
  });
});
