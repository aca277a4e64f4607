import { median } from '../../analysis/align/robustLine.js';
import { dropsOf } from '../../analysis/happenings.js';
import type { SessionData } from '../../analysis/readSession.js';
import { BOUT_GAP_US, contactsOf, isPaw, lickBoutsOf } from './contacts.js';
import {
  aheadCm,
  GRID_S,
  type Grid,
  gridOf,
  indexAt,
  RUNS_ABOVE,
  type Stretch,
  stretchesOf,
} from './stretches.js';

/** What one session shows of its animal; lengths in seconds, distances in cm, thirst corrected for. */
export interface Observed {
  readonly name: string;
  readonly subject: string;
  readonly minutes: number;
  /** Per running bout: its median speed away from the spout. */
  readonly cruise: readonly number[];
  /** Seconds of running at risk of an end, and ends that no drop caused. */
  readonly runS: number;
  /** Seconds of running as they were. */
  readonly runningS: number;
  readonly runEnds: number;
  readonly pauses: readonly number[];
  readonly grooms: number;
  readonly backs: number;
  /** The highest speed of each burst. */
  readonly bursts: readonly number[];
  readonly lickHz: readonly number[];
  readonly contactsMs: readonly number[];
  /** Licks in each bout away from the spout. */
  readonly dryLicks: readonly number[];
  readonly drinkLicks: readonly number[];
  readonly drinkS: readonly number[];
  readonly drops: number;
  readonly missed: number;
  /** Of each lap: how far before the spout it began to lick. */
  readonly anticipation: readonly number[];
  /** Pairs of distance before the spout and speed there, running. */
  readonly approach: readonly (readonly [aheadCm: number, speedCmPerS: number])[];
  /** Between drops, the first before the first drop: lick bouts away from the spout, seconds run there. */
  readonly dry: readonly (readonly [bouts: number, seconds: number])[];
}

/** Where licks and speed have nothing to do with the spout: further from it than this. */
const BEFORE_CM = 40;
const BEHIND_CM = 30;
/** A drop makes the animal stop within this. */
const STOPS_S = 1.5;
/** Who drinks begins within this (common practice, no source). */
const DRINKS_US = 3_000_000;
const BURST_CM_S = 38;
const BACK_CM_S = -0.25;
/** Speed in the first part of a bout is still rising. */
const RISING_S = 0.8;
const APPROACH_CM = 60;

/** @param quenchedUl water that quenches the thirst wholly, by which stretches are corrected */
export function observe(session: SessionData, quenchedUl: number): Observed {
  const grid = gridOf(session);
  const stretches = stretchesOf(grid);
  const drops = dropsOf(session).sort((a, b) => a.boardUs - b.boardUs);
  const { lengthCm } = session.rig.belt;
  const places = drops.flatMap(({ positionCm }) => (positionCm === null ? [] : [positionCm]));
  const spoutCm = places.length === 0 ? Number.NaN : median(places);
  const contacts = contactsOf(session);
  const bouts = lickBoutsOf(contacts);
  const away = (n: number) => {
    const ahead = aheadCm(grid.positionCm[n] ?? Number.NaN, spoutCm, lengthCm);
    return ahead > BEFORE_CM && ahead < lengthCm - BEHIND_CM;
  };
  const dropAt = drops.map(({ boardUs }) => indexAt(grid, boardUs));
  let drunk = 0;
  const thirstAt = dropAt.map((n, i) => {
    drunk += drops[i]!.volumeUl;
    return { n, thirst: Math.max(0.1, 1 - drunk / quenchedUl) };
  });
  const thirst = (n: number) => thirstAt.findLast((entry) => entry.n <= n)?.thirst ?? 1;
  const paws = contacts.filter(isPaw).map(({ us }) => indexAt(grid, us));
  return {
    ...{ name: session.description.name, subject: session.description.subject },
    minutes: (session.endedUs - session.beganUs) / 60e6,
    ...running(grid, stretches, away, dropAt, thirst),
    ...resting(grid, stretches, dropAt, paws, thirst),
    lickHz: bouts.map(({ hz }) => hz).filter(Number.isFinite),
    contactsMs: bouts.flatMap(({ contactsMs }) => contactsMs),
    dryLicks: bouts.filter(({ us }) => away(indexAt(grid, us))).map(({ licks }) => licks),
    ...drinking(grid, drops, dropAt, contacts),
    ...approaching(grid, stretches, spoutCm, lengthCm, dropAt, contacts),
    dry: dryOf(grid, stretches, away, dropAt, bouts, thirst),
  };
}

type Thirst = (n: number) => number;

function running(
  { speedCmPerS }: Grid,
  stretches: readonly Stretch[],
  away: (n: number) => boolean,
  dropAt: readonly number[],
  thirst: Thirst,
) {
  const cruise: number[] = [];
  const bursts: number[] = [];
  let runS = 0;
  let runningS = 0;
  let runEnds = 0;
  stretches.forEach(({ running: runs, from, to }, i) => {
    if (!runs) return;
    const lengthS = (to - from) * GRID_S;
    const stoppedByDrop = dropAt.some((n) => n >= from && n <= to && (to - n) * GRID_S < STOPS_S);
    runningS += lengthS;
    runS += lengthS / Math.max(0.2, thirst(from));
    if (!stoppedByDrop && i < stretches.length - 1) runEnds++;
    const speeds: number[] = [];
    for (let n = from + Math.round(RISING_S / GRID_S); n < to; n++) {
      if (away(n)) speeds.push(speedCmPerS[n]!);
    }
    if (speeds.length * GRID_S > 1) cruise.push(median(speeds));
    let peak = 0;
    for (let n = from; n < to; n++) {
      const speed = speedCmPerS[n]!;
      if (speed >= BURST_CM_S) peak = Math.max(peak, speed);
      else if (peak > 0) {
        bursts.push(peak);
        peak = 0;
      }
    }
  });
  return { cruise, bursts, runS, runningS, runEnds };
}

function resting(
  { speedCmPerS }: Grid,
  stretches: readonly Stretch[],
  dropAt: readonly number[],
  paws: readonly number[],
  thirst: Thirst,
) {
  const pauses: number[] = [];
  let grooms = 0;
  let backs = 0;
  // The first rest is the session's beginning, the last one its end.
  for (const { running: runs, from, to } of stretches.slice(1, -1)) {
    if (runs) continue;
    const drinks = dropAt.some((n) => n <= to && (from - n) * GRID_S < STOPS_S);
    if (drinks) continue;
    if (paws.some((n) => n >= from && n < to)) {
      grooms++;
      continue;
    }
    pauses.push((to - from) * GRID_S * thirst(from));
    if (speedCmPerS.subarray(from, to).some((speed) => speed < BACK_CM_S)) backs++;
  }
  return { pauses, grooms, backs };
}

function drinking(
  grid: Grid,
  drops: readonly { readonly boardUs: number }[],
  dropAt: readonly number[],
  contacts: ReturnType<typeof contactsOf>,
) {
  const drinkLicks: number[] = [];
  const drinkS: number[] = [];
  let missed = 0;
  drops.forEach(({ boardUs }, i) => {
    const first = contacts.findIndex(({ us }) => us >= boardUs);
    if (first < 0 || contacts[first]!.us > boardUs + DRINKS_US) {
      missed++;
      return;
    }
    let last = first;
    while (
      last + 1 < contacts.length &&
      contacts[last + 1]!.us - contacts[last]!.us < BOUT_GAP_US
    ) {
      last++;
    }
    drinkLicks.push(last - first + 1);
    const from = dropAt[i]!;
    let n = from;
    while (n < grid.speedCmPerS.length && grid.speedCmPerS[n]! > RUNS_ABOVE / 2) n++;
    // It did not stop for this one.
    if ((n - from) * GRID_S > STOPS_S) return;
    while (n < grid.speedCmPerS.length && grid.speedCmPerS[n]! <= RUNS_ABOVE) n++;
    if (n < grid.speedCmPerS.length) drinkS.push((n - from) * GRID_S);
  });
  return { drops: drops.length, missed, drinkLicks, drinkS };
}

function approaching(
  grid: Grid,
  stretches: readonly Stretch[],
  spoutCm: number,
  lengthCm: number,
  dropAt: readonly number[],
  contacts: ReturnType<typeof contactsOf>,
) {
  const approach: [number, number][] = [];
  const anticipation: number[] = [];
  if (Number.isNaN(spoutCm)) return { approach, anticipation };
  for (const { running: runs, from, to } of stretches) {
    if (!runs) continue;
    for (let n = from + Math.round(RISING_S / GRID_S); n < to; n++) {
      const ahead = aheadCm(grid.positionCm[n]!, spoutCm, lengthCm);
      if (ahead < APPROACH_CM) approach.push([ahead, grid.speedCmPerS[n]!]);
    }
  }
  let before = 0;
  for (const drop of dropAt) {
    const first = contacts.find(({ us }) => {
      const n = indexAt(grid, us);
      const ahead = aheadCm(grid.positionCm[n] ?? Number.NaN, spoutCm, lengthCm);
      return n > before && n < drop && ahead < BEFORE_CM / 2;
    });
    before = drop;
    if (first === undefined) continue;
    const ahead = aheadCm(grid.positionCm[indexAt(grid, first.us)]!, spoutCm, lengthCm);
    anticipation.push(ahead);
  }
  return { approach, anticipation };
}

function dryOf(
  grid: Grid,
  stretches: readonly Stretch[],
  away: (n: number) => boolean,
  dropAt: readonly number[],
  bouts: ReturnType<typeof lickBoutsOf>,
  thirst: Thirst,
): [number, number][] {
  const dry = Array.from({ length: dropAt.length + 1 }, (): [number, number] => [0, 0]);
  const gapOf = (n: number) => {
    let gap = 0;
    while (gap < dropAt.length && dropAt[gap]! <= n) gap++;
    return gap;
  };
  for (const { running: runs, from, to } of stretches) {
    if (!runs) continue;
    const gap = gapOf(from);
    // A bout of running in which a drop came belongs to what was known before it.
    for (let n = from; n < to; n++) if (away(n)) dry[gap]![1] += GRID_S * thirst(from);
  }
  for (const { us, licks, hz } of bouts) {
    const n = indexAt(grid, us);
    // At rest it may be a paw that touched.
    const runs = stretches.some(({ running: is, from, to }) => is && n >= from && n < to);
    if (!runs || !away(n)) continue;
    const own = dry[gapOf(n)]!;
    own[0]++;
    // While it licks, no other bout can be seen to begin.
    const lastsS = Number.isNaN(hz) ? 0 : (licks - 1) / hz;
    own[1] = Math.max(0, own[1] - (lastsS + BOUT_GAP_US / 1e6) * thirst(n));
  }
  return dry;
}
