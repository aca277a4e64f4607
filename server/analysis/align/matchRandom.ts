import { type Line, median, robustLine, valueAt } from './robustLine.js';

/** Which edge is which: indices into the two lists, both rising. */
export interface Pair {
  readonly ref: number;
  readonly other: number;
}
/** A refusal's reason. */
export type Why = string;

/** Two crystals differ by less than this; the clocks of common boards by 200 ppm at most. */
const MOST_DRIFT = 300e-6;
/** The rate of one clock wanders by less than this over some minutes. */
const WANDER = 50e-6;
/** How far from its place an edge may be seen: sampling, debouncing. */
const JITTER_S = 0.001;
const WINDOW = 30;
/** Lost and spurious edges change the usual interval by less than this factor. */
const SCALE = 4;
const LEAST_VOTES = 8;
/** Edges in a row that fit nowhere, after which the match is sought anew. */
const LOST = 20;
const LOCAL = 40;

/**
 * Finds which of the other clock's edges is which of ours, by the random intervals between them.
 *
 * A stretch of the other's edges votes for every offset at which one of them would meet one of ours:
 * at the true one nearly all agree, at any other only as many as chance brings. From there the match
 * is followed forwards and backwards edge by edge, with the line through the last pairs, so that
 * drift, lost and spurious edges and a late start do no harm.
 * @param ref our times, s, rising; `other`: theirs, in their seconds, rising
 */
export function matchRandom(ref: readonly number[], other: readonly number[]): Pair[] | Why {
  if (other.length < LEAST_VOTES) return `${other.length} edges are too few to be recognised`;
  if (ref.length < LEAST_VOTES) return `the record holds only ${ref.length} edges of that line`;
  const usual = (times: readonly number[]) => median(times.slice(1).map((t, i) => t - times[i]!));
  const [ours, theirs] = [usual(ref), usual(other)];
  if (theirs > SCALE * ours || theirs < ours / SCALE)
    return (
      `its edges are usually ${theirs.toPrecision(3)} s apart and the record's ` +
      `${ours.toPrecision(3)} s: they are in other units, or of another line`
    );
  let why: Why = '';
  for (let from = 0; from < other.length; from += WINDOW) {
    const seeded = seed(ref, other, Math.min(from, Math.max(0, other.length - WINDOW)));
    if (typeof seeded === 'string') {
      why = seeded;
      continue;
    }
    const later = follow(ref, other, seeded);
    const back = follow(mirrored(ref), mirrored(other), mirroredPairs(seeded, ref, other));
    const earlier = mirroredPairs(back, ref, other);
    const first = seeded[0]!.other;
    return [...earlier.filter((pair) => pair.other < first), ...later];
  }
  return why;
}

/** The stretch of edges that begins at `from`, matched by vote. */
function seed(ref: readonly number[], other: readonly number[], from: number): Pair[] | Why {
  const to = Math.min(other.length, from + WINDOW);
  const widthS = JITTER_S + MOST_DRIFT * (other[to - 1]! - other[from]!);
  const votes = new Map<number, number>();
  for (let j = from; j < to; j++) {
    for (const time of ref) {
      const bin = Math.floor((other[j]! - time) / widthS);
      votes.set(bin, (votes.get(bin) ?? 0) + 1);
    }
  }
  const both = (bin: number) => (votes.get(bin) ?? 0) + (votes.get(bin + 1) ?? 0);
  let best = 0;
  let bestVotes = 0;
  for (const bin of votes.keys()) {
    if (both(bin) > bestVotes) {
      best = bin;
      bestVotes = both(bin);
    }
  }
  let rival = 0;
  for (const bin of votes.keys()) if (Math.abs(bin - best) > 2) rival = Math.max(rival, both(bin));
  const asked = to - from;
  if (bestVotes < LEAST_VOTES || bestVotes < asked / 2)
    return `at the best offset only ${bestVotes} of ${asked} edges meet one of the record's`;
  if (rival > 0.65 * bestVotes)
    return `two offsets fit about as well (${bestVotes} and ${rival} of ${asked} edges)`;
  const pairs: Pair[] = [];
  let i = 0;
  for (let j = from; j < to; j++) {
    // Rising, since both lists rise and an edge of ours serves once.
    while (i < ref.length && other[j]! - ref[i]! >= (best + 2) * widthS) i++;
    if (i === ref.length || other[j]! - ref[i]! < best * widthS) continue;
    pairs.push({ ref: i++, other: j });
  }
  return cleaned(ref, other, pairs);
}

/** Of the pairs of a short stretch, those that lie on one line. */
function cleaned(ref: readonly number[], other: readonly number[], pairs: readonly Pair[]): Pair[] {
  const line = lineOf(ref, other, pairs);
  const near = (pair: Pair) =>
    Math.abs(other[pair.other]! - valueAt(line, ref[pair.ref]!)) < 3 * JITTER_S;
  return pairs.filter(near);
}

/** Goes on from matched pairs to the end of the list. */
function follow(ref: readonly number[], other: readonly number[], seeded: readonly Pair[]): Pair[] {
  const pairs = [...seeded];
  let line = lineOf(ref, other, pairs.slice(-LOCAL));
  let sure = pairs.length >= LOCAL;
  let i = pairs.at(-1)!.ref + 1;
  let unmatched = 0;
  for (let j = pairs.at(-1)!.other + 1; j < other.length; j++) {
    const gapS = other[j]! - other[pairs.at(-1)!.other]!;
    const within = JITTER_S + (sure ? WANDER : MOST_DRIFT) * gapS;
    while (i < ref.length && valueAt(line, ref[i]!) < other[j]! - within) i++;
    const found = nearest(ref, i, line, other[j]!, within);
    if (found >= 0) {
      pairs.push({ ref: found, other: j });
      i = found + 1;
      unmatched = 0;
      if (pairs.length % 5 === 0 || !sure) line = lineOf(ref, other, pairs.slice(-LOCAL));
      sure ||= pairs.length >= LOCAL;
      continue;
    }
    if (++unmatched < LOST) continue;
    unmatched = 0;
    const again = seed(ref, other, j - LOST + 1);
    if (typeof again === 'string' || again[0]!.ref <= pairs.at(-1)!.ref) continue;
    pairs.push(...again.filter((pair) => pair.other > pairs.at(-1)!.other));
    line = lineOf(ref, other, again);
    i = pairs.at(-1)!.ref + 1;
    j = pairs.at(-1)!.other;
  }
  return pairs;
}

function nearest(
  ref: readonly number[],
  from: number,
  line: Line,
  time: number,
  within: number,
): number {
  let found = -1;
  let least = within;
  for (let i = from; i < ref.length; i++) {
    const away = valueAt(line, ref[i]!) - time;
    if (away > within) break;
    if (Math.abs(away) > least) continue;
    least = Math.abs(away);
    found = i;
  }
  return found;
}

/** Through few pairs the slope is not to be trusted beyond what clocks can do. */
function lineOf(ref: readonly number[], other: readonly number[], pairs: readonly Pair[]): Line {
  const x = pairs.map((pair) => ref[pair.ref]!);
  const y = pairs.map((pair) => other[pair.other]!);
  const line = robustLine(x, y);
  if (Math.abs(line.slope - 1) <= MOST_DRIFT) return line;
  const slope = 1 + Math.sign(line.slope - 1) * MOST_DRIFT;
  const middle = Math.floor(pairs.length / 2);
  return { slope, offset: y[middle]! - slope * x[middle]! };
}

const mirrored = (times: readonly number[]) => times.map((time) => -time).reverse();

function mirroredPairs(
  pairs: readonly Pair[],
  ref: readonly number[],
  other: readonly number[],
): Pair[] {
  const turn = (pair: Pair) => ({
    ref: ref.length - 1 - pair.ref,
    other: other.length - 1 - pair.other,
  });
  return pairs.map(turn).reverse();
}
