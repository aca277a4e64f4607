import { quantile } from '../../analysis/align/robustLine.js';
import { type Distribution, distribution, logEdges } from '../statistics/distribution.js';
import { type Contact, intervalsOf } from './contacts.js';

/** Ranges that a lick sensor's settings are kept in: common practice, no source. */
const USUAL_LOCKOUT_US = 50_000;
const LOCKOUT_US = { least: 10_000, most: 80_000 } as const;
const USUAL_STUCK_US = 1_000_000;
/** Onsets nearer than this cannot be two licks: above 12 Hz, common practice, no source. */
const FASTEST_INTERVAL_US = 1_000_000 / 12;
/** Fewer contacts say too little. */
export const LEAST_CONTACTS = 50;

/** A setting, and why. */
export interface Proposal {
  readonly us: number;
  readonly because: string;
}

export interface LickFit {
  readonly contacts: number;
  readonly contactMs: Distribution;
  readonly intervalMs: Distribution;
  /** Onsets too near to the one before to be a lick of their own: bounces. */
  readonly bounces: number;
  readonly lockout: Proposal;
  readonly stuck: Proposal;
  /** Within bouts (intervals up to half a second), per second. */
  readonly lickHz: number;
}

const IN_BOUT_US = 500_000;

/** Histograms of live licking, and what they say the sensor should be set to. */
export function fitLicks(contacts: readonly Contact[]): LickFit {
  const intervalsUs = intervalsOf(contacts);
  const inBout = intervalsUs.filter((us) => us <= IN_BOUT_US && us >= FASTEST_INTERVAL_US);
  const bouncesUs = intervalsUs.filter((us) => us < FASTEST_INTERVAL_US);
  const lastsUs = withoutBounces(contacts).map((contact) => contact.lastsUs);
  return {
    contacts: contacts.length,
    contactMs: distribution(
      lastsUs.map((us) => us / 1_000),
      logEdges(1, 2_000, 6),
    ),
    intervalMs: distribution(
      intervalsUs.map((us) => us / 1_000),
      logEdges(1, 10_000, 6),
    ),
    bounces: bouncesUs.length,
    lockout: proposeLockout(bouncesUs, inBout),
    stuck: proposeStuck(lastsUs),
    lickHz: 1_000_000 / quantile(inBout, 0.5),
  };
}

/** Contacts too near to be two licks are one, from the first touch to the last. */
function withoutBounces(contacts: readonly Contact[]): Contact[] {
  const licks: Contact[] = [];
  for (const { fromUs, lastsUs } of contacts) {
    const last = licks.at(-1);
    if (last === undefined || fromUs - last.fromUs >= FASTEST_INTERVAL_US) {
      licks.push({ fromUs, lastsUs });
    } else {
      licks[licks.length - 1] = { fromUs: last.fromUs, lastsUs: fromUs + lastsUs - last.fromUs };
    }
  }
  return licks;
}

/** Above the bounces, and well below the time from one lick to the next. */
function proposeLockout(bouncesUs: readonly number[], licksUs: readonly number[]): Proposal {
  const soonestUs = licksUs.length === 0 ? FASTEST_INTERVAL_US : quantile(licksUs, 0.01);
  const soonestMs = Math.round(soonestUs / 1_000);
  if (bouncesUs.length === 0) {
    const us = Math.min(USUAL_LOCKOUT_US, roundMs(0.8 * soonestUs));
    return {
      us,
      because: `no bounce was seen, and licks follow each other by ${soonestMs} ms or more`,
    };
  }
  const longestUs = quantile(bouncesUs, 0.99);
  const longestMs = Math.ceil(longestUs / 1_000);
  // In between on a scale of ratios, and never so long that it would swallow a lick.
  const between = Math.min(Math.sqrt(longestUs * soonestUs), 0.8 * soonestUs);
  const us = Math.min(LOCKOUT_US.most, Math.max(LOCKOUT_US.least, roundMs(between)));
  const clear = us > longestUs;
  return {
    us,
    because: clear
      ? `bounces end within ${longestMs} ms, and licks follow each other by ${soonestMs} ms or more`
      : `bounces last up to ${longestMs} ms, almost as long as from lick to lick (${soonestMs} ms): look at the sensor first`,
  };
}

/** Three times the longest usual contact, in whole tenths of a second. */
function proposeStuck(lastsUs: readonly number[]): Proposal {
  const longUs = quantile(lastsUs, 0.99);
  const us = Math.max(300_000, Math.ceil((3 * longUs) / 100_000) * 100_000);
  const longMs = Math.round(longUs / 1_000);
  if (us >= USUAL_STUCK_US) {
    return {
      us: USUAL_STUCK_US,
      because: `contacts as long as ${longMs} ms were seen: a wet or bridged spout, or paws`,
    };
  }
  return { us, because: `99 of 100 contacts end within ${longMs} ms` };
}

function roundMs(us: number): number {
  return Math.round(us / 1_000) * 1_000;
}

/** Onsets at the changes of one output: echoes of its current in the sensor, or chance. */
export interface EchoRate {
  readonly output: string;
  readonly changes: number;
  /** Changes with an onset within the window. */
  readonly echoes: number;
  /** So many would fall there by chance, at the rate of onsets elsewhere. */
  readonly byChance: number;
}

/**
 * How often an onset lies within `windowUs` after a change of an output.
 * @param spanUs how long both were watched
 */
export function echoRate(
  output: string,
  changesUs: readonly number[],
  onsetsUs: readonly number[],
  windowUs: number,
  spanUs: number,
): EchoRate {
  const near = (changeUs: number) =>
    onsetsUs.some((us) => us >= changeUs && us - changeUs <= windowUs);
  const echoes = changesUs.filter(near).length;
  const perUs = spanUs > 0 ? onsetsUs.length / spanUs : 0;
  // Poisson: the chance of one or more in a window, for each change.
  const byChance = changesUs.length * (1 - Math.exp(-perUs * windowUs));
  return { output, changes: changesUs.length, echoes, byChance };
}
