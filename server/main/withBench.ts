import { resolve } from 'node:path';
import { LoopBench } from '../calibrate/loopBench.js';
import { SimulatedHands } from '../calibrate/simulatedHands.js';
import { LapwingError } from '../errors/codes.js';
import { rigAddress } from '../loop/rigLock.js';
import type { Rig } from '../session/rig/rig.js';
import { Launcher } from './launcher.js';
import { tellPortWarnings } from './tellWarnings.js';

/** What a command may use of the rig while it has its bench. */
export interface BenchInUse {
  readonly bench: LoopBench;
  readonly hands: SimulatedHands | undefined;
  /** Aborted by Ctrl-C, and when the loop goes away. */
  readonly signal: AbortSignal;
}

/**
 * Lends the bench of the rig's loop: of the one that runs already (with its page), or of one that is
 * started for this and ended afterwards. The loop alone ever holds the port.
 */
export async function withBench<T>(
  rig: Rig,
  rigPath: string,
  use: (inUse: BenchInUse) => Promise<T>,
): Promise<T> {
  const stop = new AbortController();
  const onSignal = () => stop.abort(new LapwingError('calibrateStopped', 'Ctrl-C.'));
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  const address = rigAddress(rig.name);
  const lost = (why: LapwingError) => stop.abort(why);
  let launcher: Launcher | undefined;
  let bench: LoopBench | undefined;
  let hands: SimulatedHands | undefined;
  try {
    try {
      bench = await LoopBench.open(address);
    } catch (error) {
      if (!(error instanceof LapwingError) || error.code !== 'LOOP_AWAY') throw error;
      launcher = await startLoop(rig, rigPath);
      bench = await Promise.race([LoopBench.open(address), failing(launcher)]);
    }
    bench.onLost(lost);
    hands = bench.board.simulated ? await SimulatedHands.open(address.handsPath) : undefined;
    return await use({ bench, hands, signal: stop.signal });
  } finally {
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
    await hands?.say('speed off').catch(() => {});
    hands?.close();
    bench?.close();
    launcher?.stop();
    await launcher?.finished.catch(() => {});
  }
}

/** A loop of our own, without a page. */
async function startLoop(rig: Rig, rigPath: string): Promise<Launcher> {
  tellPortWarnings(rig.port);
  let ready: () => void = () => {};
  const readied = new Promise<void>((resolve) => {
    ready = resolve;
  });
  const launcher = new Launcher(
    { rig, loop: { rigPath: resolve(rigPath), exitWhenEnded: false } },
    { ready: () => ready(), restarted: () => {}, sessionEnded: () => {} },
  );
  await launcher.start();
  await Promise.race([readied, failing(launcher)]);
  return launcher;
}

/** Rejects when the loop cannot run. */
async function failing(launcher: Launcher): Promise<never> {
  await launcher.finished;
  throw new LapwingError('loopAway', 'The loop left.');
}
