/** How far from their places firings rose: those that the board started by itself, and the host's. */
export const ERRORS_KEPT = 5_000;
export const ERROR_BINS = 21;

/** Half widths of the scale, mm: the least that holds every error shown. */
const SCALES_MM = [0.5, 1, 2, 5, 10, 20, 50, 100, 200, 500, 1_000, 2_000];

export interface ErrorSpread {
  readonly count: number;
  /** Of the distances, whichever side they are on. */
  readonly medianMm: number;
  readonly mostMm: number;
  /** How many lie in each of `ERROR_BINS` even bins from -`scaleMm` to +`scaleMm`. */
  readonly bins: readonly number[];
}

/** The newest errors of a session, mm; after the place is positive. */
export class FiringErrors {
  readonly board: number[] = [];
  readonly host: number[] = [];

  add(armed: boolean, errorMm: number): void {
    const list = armed ? this.board : this.host;
    list.push(errorMm);
    if (list.length > ERRORS_KEPT) list.shift();
  }

  clear(): void {
    this.board.length = 0;
    this.host.length = 0;
  }

  /** Half the scale's width, mm: both sides and both kinds of firing are drawn on one. */
  get scaleMm(): number {
    let most = 0;
    for (const list of [this.board, this.host]) {
      for (const error of list) most = Math.max(most, Math.abs(error));
    }
    return SCALES_MM.find((scale) => scale >= most) ?? SCALES_MM.at(-1)!;
  }
}

/** @returns undefined where there are none */
export function spreadOf(errorsMm: readonly number[], scaleMm: number): ErrorSpread | undefined {
  if (errorsMm.length === 0) return undefined;
  const bins: number[] = new Array(ERROR_BINS).fill(0);
  for (const error of errorsMm) {
    const bin = Math.floor(((error + scaleMm) / (2 * scaleMm)) * ERROR_BINS);
    bins[Math.min(Math.max(bin, 0), ERROR_BINS - 1)]!++;
  }
  const away = errorsMm.map(Math.abs).sort((a, b) => a - b);
  const middle = away.length >> 1;
  const medianMm = away.length % 2 === 1 ? away[middle]! : (away[middle - 1]! + away[middle]!) / 2;
  return { count: away.length, medianMm, mostMm: away.at(-1)!, bins };
}
