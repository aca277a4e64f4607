import type { BenchItem, Tried, TryRequest } from '../../loop/protocol.js';
import type { Desk } from './guide.js';

export type Edge = Extract<BenchItem, { is: 'edge' }>;

/** How often what has come is looked at, ms. */
const LOOK_MS = 20;

/**
 * Collects the edges of one input until `enough` says so; asked again whenever there are more.
 * @param line the board's number of the input
 * @param mostUs gives up after so long of board time; what came until then is returned
 */
export async function collectEdges(
  desk: Desk,
  line: number,
  enough: (edges: readonly Edge[]) => boolean,
  mostUs = Number.POSITIVE_INFINITY,
): Promise<Edge[]> {
  const edges: Edge[] = [];
  const fromUs = desk.bench.now.atUs;
  const stop = desk.bench.listen((item) => {
    if (item.is === 'edge' && item.line === line) edges.push(item);
  });
  let seen = -1;
  try {
    for (;;) {
      if (edges.length !== seen) {
        seen = edges.length;
        if (enough(edges)) return edges;
      }
      if (desk.bench.now.atUs - fromUs >= mostUs) return edges;
      await desk.pause(LOOK_MS);
    }
  } finally {
    stop();
  }
}

/** Until frames have come that are younger than now: what was just done is in them. */
export async function lookAnew(desk: Desk): Promise<void> {
  const fromUs = desk.bench.now.atUs;
  while (desk.bench.now.atUs < fromUs + 50_000) await desk.pause(LOOK_MS);
}

/** A pulse that came too late was not begun, so it may be asked again; so often. */
const TRIES = 4;

/**
 * One pulse, asked again where the computer was held up on the way.
 * @throws what `attempt` of the bench throws
 */
export async function pulse(desk: Desk, request: TryRequest): Promise<Tried> {
  for (let tries = 1; ; tries++) {
    try {
      return await desk.bench.attempt(request);
    } catch (error) {
      if ((error as { code?: unknown }).code !== 'BENCH_LATE' || tries >= TRIES) throw error;
      await desk.pause(LOOK_MS);
    }
  }
}

/** Frames come every 5 ms at least, so what the guard calls now may be that old. */
const FRAME_MS = 10;

/** Waits after a pulse until the output may be tried again, and `usualMs` at least. */
export function gap(desk: Desk, { leastGapUs }: { leastGapUs: number }, usualMs: number) {
  return desk.pause(Math.max(usualMs, Math.ceil(leastGapUs / 1_000) + FRAME_MS));
}

/** The board's number of an input, by its name in the rig file. */
export function lineOf(desk: Desk, input: string): number {
  return desk.rig.inputs.find(({ name }) => name === input)?.line ?? -1;
}
