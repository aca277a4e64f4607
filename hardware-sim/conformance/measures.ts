/** What can be measured on any board, over its own line. */
import { OUTCOME } from '../../server/wire/messages.js';
import type { ConformanceHost } from './conformanceHost.js';

/** The host's clock, microseconds. */
export type HostClock = () => number;

export interface RoundTrip {
  readonly asked: number;
  /** Never answered: the board had taken a host that stood still for a dead one. */
  readonly unanswered: number;
  readonly medianUs: number;
  readonly mostUs: number;
}

const middle = (sorted: readonly number[]): number => sorted[Math.floor(sorted.length / 2)]!;

/** From a command to the board's refusal of it: nothing fires. `wait` decides how finely it is seen. */
export async function measureRoundTrip(
  host: ConformanceHost,
  clock: HostClock,
  asked = 200,
): Promise<RoundTrip> {
  const us: number[] = [];
  const connect = async (): Promise<number> => {
    await host.connect();
    const output = host.identity.outputs - 1;
    host.configure({ output, longestOnUs: 0 });
    return output;
  };
  const never = await connect();
  for (let n = 0; n < asked; n++) {
    const known = host.outcomes.length;
    const fromUs = clock();
    host.pulse({ output: never });
    for (let turn = 0; turn < 200 && host.outcomes.length === known; turn++)
      await host.line.wait(0);
    for (let turn = 0; turn < 4_000 && host.outcomes.length === known; turn++)
      await host.line.wait(500);
    if (host.outcomes.length > known) us.push(clock() - fromUs);
    else await connect();
    host.check(n < 20 || 2 * us.length > n, 'most commands were never answered');
    if (n % 8 === 0) host.beat();
  }
  us.sort((a, b) => a - b);
  return { asked, unanswered: asked - us.length, medianUs: middle(us), mostUs: us.at(-1)! };
}

/**
 * How much faster the board's clock runs than the host's, parts per million. Of each end's samples
 * the one that was least delayed counts.
 */
export async function measureDrift(
  host: ConformanceHost,
  clock: HostClock,
  seconds = 10,
): Promise<number> {
  await host.connect();
  const least = async (): Promise<{ boardUs: number; hostUs: number }> => {
    let best = { boardUs: 0, hostUs: Number.POSITIVE_INFINITY };
    let first: number | undefined;
    for (let n = 0; n < 200; n++) {
      await host.wait(2_000);
      const boardUs = host.last(host.samples, 'sample').boardUs;
      first ??= boardUs;
      const hostUs = clock();
      const behind = hostUs - ((boardUs - first) | 0);
      if (behind < best.hostUs - ((best.boardUs - first) | 0) || n === 0)
        best = { boardUs, hostUs };
      if (n % 10 === 0) host.beat();
    }
    return best;
  };
  const from = await least();
  await host.live(seconds * 1e6);
  const to = await least();
  const boardUs = (to.boardUs - from.boardUs) >>> 0;
  return (boardUs / (to.hostUs - from.hostUs) - 1) * 1e6;
}

export interface Loopback {
  readonly pulses: number;
  readonly seen: number;
  /** From the rise as the board tells it to the edge as it sees it: its own doubt of a stamp. */
  readonly medianUs: number;
  readonly mostUs: number;
}

/** With a wire from an output to an input (active low: the output idles high), both ends' stamps. */
export async function measureLoopback(
  host: ConformanceHost,
  output: number,
  input: number,
  pulses = 50,
): Promise<Loopback> {
  const connect = async (): Promise<void> => {
    await host.connect();
    host.configure({ output, flags: 1 });
    await host.live(5_000);
  };
  await connect();
  const us: number[] = [];
  for (let n = 0; n < pulses; n++) {
    host.edges.length = 0;
    const id = host.pulse({ output, widthUs: 2_000 });
    await host.live(8_000);
    const fired = host.outcomes.find((one) => one.id === id && one.kind === OUTCOME.fired);
    const edge = host.edges.find((one) => one.input === input && one.level === 1);
    if (fired && edge) us.push(Math.abs((edge.boardUs - fired.boardUs) | 0));
    else if (!fired) await connect();
  }
  host.send('quiet', { outputs: 0xffff });
  us.sort((a, b) => a - b);
  return {
    pulses,
    seen: us.length,
    medianUs: us.length > 0 ? middle(us) : Number.NaN,
    mostUs: us.at(-1) ?? Number.NaN,
  };
}
