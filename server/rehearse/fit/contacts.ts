import { median } from '../../analysis/align/robustLine.js';
import type { SessionData } from '../../analysis/readSession.js';

/** One touch of the lick sensor, as the edges had it. */
export interface Contact {
  readonly us: number;
  readonly lastsUs: number;
}

/** Touches that follow each other as licks do. */
export interface LickBout {
  readonly us: number;
  readonly licks: number;
  /** Median rate within it; NaN with fewer than three licks. */
  readonly hz: number;
  readonly contactsMs: readonly number[];
}

/** Longer than any tongue touches: a paw. */
const PAW_US = 100_000;
/** Licks further apart belong to two bouts: the slowest licking is about 5 Hz. */
export const BOUT_GAP_US = 300_000;
/** Contacts this short are bounces of the one before. */
const BOUNCE_US = 3_000;

/** Every touch of the lick sensor, paws too. */
export function contactsOf({ edges, rig, beganUs, endedUs }: SessionData): Contact[] {
  const { lick } = rig;
  if (lick === undefined) return [];
  const name = rig.inputs.find(({ line }) => line === lick.line)?.name ?? `input ${lick.line}`;
  const contacts: { us: number; lastsUs: number }[] = [];
  let downUs = Number.NaN;
  for (const edge of edges) {
    if (edge.name !== name || edge.boardUs < beganUs || edge.boardUs > endedUs) continue;
    if (edge.level === 1) {
      downUs = edge.boardUs;
      continue;
    }
    if (Number.isNaN(downUs)) continue;
    const before = contacts.at(-1);
    if (before !== undefined && downUs - (before.us + before.lastsUs) < BOUNCE_US) {
      before.lastsUs = edge.boardUs - before.us;
    } else contacts.push({ us: downUs, lastsUs: edge.boardUs - downUs });
    downUs = Number.NaN;
  }
  return contacts;
}

export const isPaw = ({ lastsUs }: Contact): boolean => lastsUs > PAW_US;

/** Bouts of the tongue: those in which no touch is a paw's. */
export function lickBoutsOf(contacts: readonly Contact[]): LickBout[] {
  const bouts: LickBout[] = [];
  let from = 0;
  for (let n = 1; n <= contacts.length; n++) {
    if (n < contacts.length && contacts[n]!.us - contacts[n - 1]!.us < BOUT_GAP_US) continue;
    const own = contacts.slice(from, n);
    from = n;
    if (own.length === 0 || own.some(isPaw)) continue;
    const gaps = own.slice(1).map(({ us }, i) => us - own[i]!.us);
    bouts.push({
      ...{ us: own[0]!.us, licks: own.length },
      hz: gaps.length < 2 ? Number.NaN : 1e6 / median(gaps),
      contactsMs: own.map(({ lastsUs }) => lastsUs / 1_000),
    });
  }
  return bouts;
}
