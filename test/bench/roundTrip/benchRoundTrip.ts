import { median, type Quantiles, quantilesOf } from '../statistics.js';
import { compilePrograms } from './compile.js';
import {
  bareC,
  bareNode,
  type Contestant,
  linkAlone,
  type RunningContestant,
} from './contestants.js';
import { type Block, Peer } from './peer.js';

export interface RoundTripOptions {
  /** Compared with the bare C echo, beside the bare Node echo and the link alone. */
  readonly contestants?: readonly Contestant[];
  /** How often each contestant has its turn. */
  readonly rounds?: number;
  /** Causes in a turn, 10 ms apart. */
  readonly causes?: number;
}

export interface ContestantResult {
  readonly name: string;
  /** Microseconds, over all turns. */
  readonly tripsUs: Quantiles;
  readonly unanswered: number;
  readonly dropped: number;
  readonly unmatched: number;
  /** Its median less C's, microseconds: one for each round; null for C itself. */
  readonly differencesUs: readonly number[] | null;
  readonly medianDifferenceUs: number | null;
  /** Its p99.9 over C's, all turns together; null for C itself. */
  readonly p999Ratio: number | null;
}

interface Entrant {
  readonly contestant: Contestant;
  readonly peer: Peer;
  readonly host: RunningContestant;
  readonly blocks: Block[];
}

const WARM_UP_CAUSES = 200;
const WARM_UP_TRIES = 15;
/** On a busy machine a rise now and then goes unanswered, and is told as lost. */
const WARM_UP_UNANSWERED = 0.05 * WARM_UP_CAUSES;

/**
 * Round trips over a pseudo-terminal, side by side: every contestant has a peer of its own that
 * sends on a schedule and never waits, and they take turns, so that what drifts on the machine
 * drifts for all. The first result is the bare C echo.
 */
export async function benchRoundTrip(options: RoundTripOptions = {}): Promise<ContestantResult[]> {
  const { contestants = [], rounds = 10, causes = 300 } = options;
  const programs = compilePrograms();
  const entrants: Entrant[] = [];
  try {
    for (const contestant of [bareC(programs.echo), bareNode, linkAlone, ...contestants]) {
      const peer = await Peer.start(programs.peer, contestant.kind);
      const host = await contestant.start(peer.pty);
      const entrant = { contestant, peer, host, blocks: [] };
      entrants.push(entrant);
      await warmUp(entrant);
    }
    for (let round = 0; round < rounds; round++) {
      // The order turns round, so that nobody always follows the same neighbour.
      const order = round % 2 === 0 ? entrants : entrants.toReversed();
      for (const { peer, blocks } of order) blocks.push(await peer.block(causes));
    }
  } finally {
    for (const { host, peer } of entrants) {
      await host.stop();
      await peer.stop();
    }
    programs.remove();
  }
  return entrants.map((entrant) => resultOf(entrant, entrants[0]!));
}

/** Turns that are not counted, until the contestant answers (compiled, session running). */
async function warmUp({ peer, contestant }: Entrant): Promise<void> {
  for (let tries = 0; tries < WARM_UP_TRIES; tries++) {
    const block = await peer.block(WARM_UP_CAUSES);
    if (block.unanswered <= WARM_UP_UNANSWERED) return;
  }
  throw new Error(`${contestant.name} does not answer every rise of the input with a pulse`);
}

function resultOf(entrant: Entrant, floor: Entrant): ContestantResult {
  const { blocks, contestant } = entrant;
  const tripsUs = quantilesOf(blocks.flatMap((block) => block.tripsUs));
  const sum = (of: (block: Block) => number) => blocks.reduce((all, block) => all + of(block), 0);
  const isFloor = entrant === floor;
  const differencesUs = blocks.map(
    (block, round) => median(block.tripsUs) - median(floor.blocks[round]!.tripsUs),
  );
  const floorTrips = quantilesOf(floor.blocks.flatMap((block) => block.tripsUs));
  return {
    name: contestant.name,
    tripsUs,
    unanswered: sum((block) => block.unanswered),
    dropped: sum((block) => block.dropped),
    unmatched: sum((block) => block.unmatched),
    differencesUs: isFloor ? null : differencesUs,
    medianDifferenceUs: isFloor ? null : median(differencesUs),
    p999Ratio: isFloor ? null : tripsUs.p999 / floorTrips.p999,
  };
}

/** A table for people: microseconds, one contestant a line. */
export function roundTripTable(results: readonly ContestantResult[]): string {
  const heads = ['us', 'n', 'p50', 'p90', 'p99', 'p99.9', 'max', '- C', 'p99.9/C', 'lost'];
  const rows = results.map((result) => {
    const { n, p50, p90, p99, p999, max } = result.tripsUs;
    const lost = result.unanswered + result.dropped + result.unmatched;
    return [
      result.name,
      String(n),
      ...[p50, p90, p99, p999, max].map((value) => value.toFixed(0)),
      result.medianDifferenceUs?.toFixed(0) ?? '',
      result.p999Ratio?.toFixed(2) ?? '',
      String(lost),
    ];
  });
  const all = [heads, ...rows];
  const widths = heads.map((_, column) => Math.max(...all.map((row) => row[column]!.length)));
  return all
    .map((row) =>
      row
        .map((cell, n) => (n === 0 ? cell.padEnd(widths[n]!) : cell.padStart(widths[n]!)))
        .join('  '),
    )
    .join('\n');
}
