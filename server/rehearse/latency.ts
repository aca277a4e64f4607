import { readFileSync } from 'node:fs';
import { LapwingError } from '../errors/codes.js';

/** How long after its cause a pulse that the host decided rises, as a distribution. */
export interface Latency {
  /** Where it is from, for whoever reads the figures. */
  readonly words: string;
  /** Shares from 0 to 1, rising, and the microseconds that this share of rises does not exceed. */
  readonly shares: readonly number[];
  readonly us: readonly number[];
}

/**
 * Where nothing was measured: round trips of this service over a pseudo-terminal, recording on, with
 * 20 dashboards attached, on a busy two-core machine. A serial line adds its own bytes.
 */
export const DEFAULT_LATENCY: Latency = {
  words: 'not measured here: a usual 0.13 ms, 1 in 100 above 0.4 ms, 1 in 1000 above 5 ms',
  shares: [0, 0.5, 0.99, 0.999, 1],
  us: [80, 130, 400, 5_000, 10_000],
};

const LONGEST_BYTES = 64 << 20;

/** The microseconds that a share of rises does not exceed, by straight lines between what is known. */
export function latencyAt({ shares, us }: Latency, share: number): number {
  let at = 1;
  while (at < shares.length - 1 && shares[at]! < share) at++;
  const from = shares[at - 1]!;
  const part = (share - from) / (shares[at]! - from || 1);
  return us[at - 1]! + Math.min(1, Math.max(0, part)) * (us[at]! - us[at - 1]!);
}

/**
 * Reads measured latencies: what `lapwing calibrate latency` keeps (its `roundTripUs`), a JSON list
 * of microseconds, or text with a number of microseconds on each line.
 * @throws LapwingError REHEARSE_LATENCY_BAD
 */
export function readLatency(path: string): Latency {
  let text: string;
  try {
    text = readFileSync(path, 'utf8');
  } catch (error) {
    throw bad(path, (error as Error).message);
  }
  if (text.length > LONGEST_BYTES) throw bad(path, 'it is longer than 64 MiB');
  const found = /^\s*[[{]/.test(text) ? fromJson(path, text) : fromLines(path, text);
  return { ...found, words: `measured: ${path}` };
}

function fromJson(path: string, text: string): Omit<Latency, 'words'> {
  let content: unknown;
  try {
    content = JSON.parse(text);
  } catch (error) {
    throw bad(path, `it is no JSON: ${(error as Error).message}`);
  }
  const round = deepFind(content, 'roundTripUs') ?? content;
  if (Array.isArray(round)) return ofValues(path, round);
  const { edges, counts } = round as { edges?: unknown; counts?: unknown };
  if (numbers(edges) && numbers(counts) && edges.length === counts.length + 1) {
    return ofCounts(path, edges, counts);
  }
  throw bad(path, 'it has no `roundTripUs` with numbers, or with `edges` and `counts`');
}

function fromLines(path: string, text: string): Omit<Latency, 'words'> {
  const lines = text.split(/\r?\n/).filter((line) => line.trim() !== '' && !line.startsWith('#'));
  return ofValues(
    path,
    lines.map((line, n) => {
      const value = Number(line.trim());
      if (!Number.isFinite(value))
        throw bad(path, `line ${n + 1} is no number: ${line.slice(0, 40)}`);
      return value;
    }),
  );
}

function ofValues(path: string, values: readonly unknown[]): Omit<Latency, 'words'> {
  if (!numbers(values) || values.length === 0) throw bad(path, 'it holds no list of numbers');
  if (values.some((us) => us < 0)) throw bad(path, 'a latency is less than 0');
  const us = [...values].sort((a, b) => a - b);
  if (us.length === 1) us.push(us[0]!);
  return { shares: us.map((_, n) => n / (us.length - 1)), us };
}

function ofCounts(
  path: string,
  edges: readonly number[],
  counts: readonly number[],
): Omit<Latency, 'words'> {
  const all = counts.reduce((sum, count) => sum + count, 0);
  if (all <= 0) throw bad(path, 'its counts are all 0');
  const shares = [0];
  let before = 0;
  for (const count of counts) {
    before += count;
    shares.push(before / all);
  }
  return { shares, us: edges };
}

function numbers(list: unknown): list is number[] {
  return Array.isArray(list) && list.every((value) => Number.isFinite(value));
}

/** The value under a key, however deep in the file it lies. */
function deepFind(node: unknown, key: string): unknown {
  if (typeof node !== 'object' || node === null) return undefined;
  if (!Array.isArray(node) && key in node) return (node as Record<string, unknown>)[key];
  for (const inner of Object.values(node)) {
    const found = deepFind(inner, key);
    if (found !== undefined) return found;
  }
  return undefined;
}

function bad(path: string, why: string): LapwingError {
  return new LapwingError('rehearseLatencyBad', `${path}: ${why}.`);
}
