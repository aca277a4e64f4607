import type { AnimalParameters } from '../../hardware-sim/animal/parameters.js';
import { SimulatedRig, type SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import type { VirtualRig } from '../session/rehearsal.js';
import type { Rig } from '../session/rig/rig.js';

/**
 * Between places and timers, a brisk rig's board reports 50 times a second and not 1000: a session
 * takes a fifth of the time, and a condition that is watched (a speed, a duration) is seen up to
 * 20 ms later. Places, licks, inputs and delays are told to the millisecond, as ever.
 */
const BRISK_REPORT_US = 20_000;

export interface SimulatedAnimal {
  readonly seed: number;
  readonly trained: boolean;
  readonly animal?: Partial<AnimalParameters>;
}

/** A simulated rig that is wired, long and calibrated as a rig file says, in virtual time. */
export function simulatedRigFor(
  rig: Rig,
  animal: SimulatedAnimal,
  brisk = false,
): VirtualRig & { readonly simulated: SimulatedRig } {
  const { belt } = rig;
  const valve = rig.outputs.find((output) => output.kind === 'valve');
  const simulated = new SimulatedRig({
    ...animal,
    ...(brisk ? { strideUs: BRISK_REPORT_US, board: { reportUs: BRISK_REPORT_US } } : {}),
    reversed: belt.reversed,
    belt: {
      ...{ lengthCm: belt.lengthCm, countsPerCm: belt.countsPerCm },
      mark: belt.seam !== undefined,
    },
    wiring: {
      ...(rig.lick === undefined ? {} : { lickInput: rig.lick.line }),
      ...(belt.seam === undefined ? {} : { seamInput: belt.seam.line }),
      ...(valve === undefined ? {} : { valveOutput: valve.line }),
    },
    ...(valve?.valve === undefined
      ? {}
      : { valve: { deadUs: valve.valve.deadUs, usPerUl: valve.valve.usPerNl * 1_000 } }),
  } satisfies SimulatedRigOptions);
  return {
    simulated,
    reentrant: true,
    get nowUs() {
      return simulated.nowUs;
    },
    advanceTo: (us) => simulated.advanceTo(us),
    ...(brisk ? { lookAt: (up, down, us) => simulated.lookAt(up, down, us) } : {}),
    connect: (listener) => simulated.board.connect(listener),
    receive: (name, message, tag) => simulated.board.receive(name, message, tag),
  };
}

/** The command line by which the simulated rig's own process is made the same. */
export function simulatedRigArguments(rig: Rig): string[] {
  const { belt, lick } = rig;
  const valve = rig.outputs.find((output) => output.kind === 'valve');
  const options: Record<string, number | undefined> = {
    'belt-cm': belt.lengthCm,
    'counts-per-cm': belt.countsPerCm,
    'lick-input': lick?.line,
    'seam-input': belt.seam?.line,
    'valve-output': valve?.line,
    'valve-dead-us': valve?.valve?.deadUs,
    'valve-us-per-ul': valve?.valve && valve.valve.usPerNl * 1_000,
  };
  const given = Object.entries(options).filter(([, value]) => value !== undefined);
  return [
    ...given.flatMap(([name, value]) => [`--${name}`, String(value)]),
    ...(belt.reversed ? ['--reversed'] : []),
    ...(belt.seam === undefined ? ['--no-mark'] : []),
    ...loopback(rig),
  ];
}

function loopback({ loopback, outputs, inputs }: Rig): string[] {
  if (loopback === undefined) return [];
  const output = outputs.find(({ name }) => name === loopback.output);
  const input = inputs.find(({ name }) => name === loopback.input);
  return ['--loopback', `${output?.line}:${input?.line}`];
}
