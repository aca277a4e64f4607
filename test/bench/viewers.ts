import { setTimeout as delay } from 'node:timers/promises';
import { compilePrograms } from './roundTrip/compile.js';
import { type Block, Peer } from './roundTrip/peer.js';
import { Viewers } from './roundTrip/viewers.js';
import { startLapwing } from './roundTrip/wholeLoop.js';
import { median, type Quantiles, quantilesOf } from './statistics.js';

export interface ViewersBench {
  readonly viewers: number;
  /** Round trips through the loop, microseconds, with nobody and with everybody watching. */
  readonly alone: Quantiles;
  readonly watched: Quantiles;
  /** Of each pair of neighbouring blocks: p99 watched over p99 alone. */
  readonly p99Ratios: readonly number[];
  readonly medianP99Ratio: number;
  /** Of the web process while everybody watches. */
  readonly coreShare: number;
  readonly memoryMb: readonly number[];
  /** States and events that each viewer got a second, and bytes. */
  readonly messagesPerS: number;
  readonly bytesPerS: number;
  readonly lost: number;
  readonly unanswered: number;
}

const CAUSES = 500;
const WARM_UP_CAUSES = 200;
const SETTLE_MS = 500;

interface Health {
  readonly memoryMb: number;
  readonly cpuS: number;
}

/**
 * One session with its page, in turns watched by nobody and by so many: what they add to the loop's
 * round trip, and what they cost the web process.
 */
export async function benchViewers(viewers = 200, pairs = 10): Promise<ViewersBench> {
  const programs = compilePrograms();
  const peer = await Peer.start(programs.peer, 'board');
  const lapwing = await startLapwing(peer.pty, true);
  const pages = await Viewers.start(lapwing.stream);
  const health = async () => (await (await fetch(`${lapwing.url}/healthz`)).json()) as Health;
  const blocks: { alone: Block[]; watched: Block[] } = { alone: [], watched: [] };
  const memoryMb: number[] = [];
  let watchedS = 0;
  let cpuS = 0;
  let heard = { messages: 0, bytes: 0, lost: 0 };
  try {
    await warmUp(peer);
    await until(health);
    for (let pair = 0; pair < pairs; pair++) {
      // The order turns round, so that what drifts on the machine drifts for both.
      const turns =
        pair % 2 === 0 ? (['alone', 'watched'] as const) : (['watched', 'alone'] as const);
      for (const turn of turns) {
        await pages.watch(turn === 'watched' ? viewers : 0);
        await delay(SETTLE_MS);
        await pages.heard();
        const [before, beganMs] = [await health(), performance.now()];
        blocks[turn].push(await peer.block(CAUSES));
        if (turn === 'alone') continue;
        const told = await pages.heard();
        const after = await health();
        watchedS += (performance.now() - beganMs) / 1000;
        cpuS += after.cpuS - before.cpuS;
        memoryMb.push(after.memoryMb);
        heard = {
          messages: heard.messages + told.messages,
          bytes: heard.bytes + told.bytes,
          lost: heard.lost + told.lost,
        };
      }
    }
  } finally {
    await pages.stop();
    await lapwing.stop();
    await peer.stop();
    programs.remove();
  }
  const p99Of = (block: Block) => quantilesOf(block.tripsUs).p99;
  const p99Ratios = blocks.watched.map((block, n) => p99Of(block) / p99Of(blocks.alone[n]!));
  const all = [...blocks.alone, ...blocks.watched];
  return {
    viewers,
    alone: quantilesOf(blocks.alone.flatMap(({ tripsUs }) => tripsUs)),
    watched: quantilesOf(blocks.watched.flatMap(({ tripsUs }) => tripsUs)),
    p99Ratios,
    medianP99Ratio: median(p99Ratios),
    coreShare: cpuS / watchedS,
    memoryMb,
    messagesPerS: heard.messages / watchedS / viewers,
    bytesPerS: heard.bytes / watchedS / viewers,
    lost: heard.lost,
    unanswered: all.reduce((sum, block) => sum + block.unanswered, 0),
  };
}

/** The page comes after the session. */
async function until(health: () => Promise<unknown>): Promise<void> {
  for (let tries = 0; tries < 300; tries++) {
    const there = await health().catch(() => undefined);
    if (there !== undefined) return;
    await delay(100);
  }
  throw new Error('the page was never served');
}

/** Until the session runs and answers. */
async function warmUp(peer: Peer): Promise<void> {
  for (let tries = 0; tries < 15; tries++) {
    if ((await peer.block(WARM_UP_CAUSES)).unanswered <= 0.05 * WARM_UP_CAUSES) return;
  }
  throw new Error('Lapwing does not answer every rise of the input with a pulse');
}
