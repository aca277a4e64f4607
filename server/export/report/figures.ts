import type { Firing } from '../../analysis/firings.js';
import type { Drop, Lap } from '../../analysis/happenings.js';
import { type Licking, SPOUT_HALF_CM } from '../../analysis/licking.js';
import { type Profile, speedByPosition } from '../../analysis/profile.js';
import { INK, Plot, type Point } from './plot.js';

/** What the figures are drawn from: complete laps that nobody excluded. */
export interface Shown {
  readonly lengthCm: number;
  readonly laps: readonly Lap[];
  readonly profile: Profile;
  readonly licking: Licking;
  readonly firings: readonly Firing[];
  readonly drops: readonly Drop[];
  /** Names of the outputs that stimulate: neither valves nor mere marks. */
  readonly stimuli: ReadonlySet<string>;
}

const belt = ({ lengthCm }: Shown) => ({
  label: 'position on the belt (cm)',
  from: 0,
  to: lengthCm,
});
const lapAxis = ({ laps }: Shown) => ({
  ...{ label: 'lap', from: laps[0]!.lap - 0.5, to: laps.at(-1)!.lap + 0.5, whole: true },
});
const top = (values: readonly number[]) =>
  Math.max(1e-9, ...values.filter((value) => Number.isFinite(value))) * 1.08;

function onBelt(plot: Plot, { licking, lengthCm }: Shown): Plot {
  const { spoutCm } = licking;
  if (spoutCm === null) return plot;
  const from = Math.max(0, spoutCm - SPOUT_HALF_CM);
  return plot.stretch(from, Math.min(lengthCm, spoutCm + SPOUT_HALF_CM), 'spout', INK.sky);
}

/** Licks, drops, stimuli and shams over position, a row a lap, the first on top. */
export function raster(shown: Shown): string {
  const { laps, licking, firings, drops, stimuli } = shown;
  const inside = new Set(laps.map(({ lap }) => lap));
  const first = laps[0]!.lap - 0.8;
  const height = Math.min(560, 70 + laps.length * 9);
  const y = { label: 'lap', from: laps.at(-1)!.lap + 0.8, to: first, whole: true };
  const title = 'Licks, water and stimuli on each lap by position on the belt';
  const plot = onBelt(new Plot(title, belt(shown), y, height), shown);
  const at = (list: readonly { lap: number; cm: number | null }[]): Point[] =>
    list.flatMap(({ lap, cm }) => (cm !== null && inside.has(lap) ? [[cm, lap] as const] : []));
  const licks = (list: Licking['before']) => list.map((l) => ({ lap: l.lap, cm: l.positionCm }));
  const fired = (sham: boolean) =>
    firings.filter((f) => f.sham === sham && (sham || stimuli.has(f.output ?? '')));
  const places = (list: readonly Firing[]) => list.map((f) => ({ lap: f.lap, cm: f.riseCm }));
  return plot
    .marks(at(licks(licking.drinking)), 'tick', INK.grey)
    .marks(at(licks(licking.before)), 'tick', INK.black)
    .marks(at(drops.map((d) => ({ lap: d.lap, cm: d.positionCm }))), 'drop', INK.blue)
    .marks(at(places(fired(false))), 'dot', INK.orange)
    .marks(at(places(fired(true))), 'ring', INK.orange)
    .toString();
}

/** Time-weighted mean speed by position, the first third of laps against the last, with spread. */
export function speed(shown: Shown): string {
  const { profile } = shown;
  const third = Math.max(1, Math.floor(profile.laps.length / 3));
  const { bins, binCm } = profile;
  const early = speedByPosition({ bins, laps: profile.laps.slice(0, third) });
  const late = speedByPosition({ bins, laps: profile.laps.slice(-third) });
  const most = top([...early, ...late].map((b) => b.meanCmPerS + (b.spreadCmPerS || 0)));
  const least = Math.min(0, ...late.map((b) => b.meanCmPerS).filter(Number.isFinite));
  const y = { label: 'speed (cm/s)', from: least, to: most };
  const plot = onBelt(new Plot('Speed by position, early and late laps', belt(shown), y), shown);
  const middle = (bin: number) => (bin + 0.5) * binCm;
  for (const [row, colour, dash] of [
    [early, INK.orange, '6 4'],
    [late, INK.blue, ''],
  ] as const) {
    plot.band(
      row.map((b, i) => [middle(i), b.meanCmPerS - b.spreadCmPerS, b.meanCmPerS + b.spreadCmPerS]),
      colour,
    );
    plot.curve(
      row.map((b, i) => [middle(i), b.meanCmPerS]),
      colour,
      dash,
    );
  }
  return plot.toString();
}

export function occupancy(shown: Shown): string {
  const { profile } = shown;
  const points = secondsByBin(profile).map(
    (s, i): Point => [(i + 0.5) * profile.binCm, s / profile.laps.length],
  );
  const y = { label: 'time there (s a lap)', from: 0, to: top(points.map(([, s]) => s)) };
  const plot = new Plot('Time spent at each position, a lap', belt(shown), y, 180);
  return onBelt(plot, shown)
    .bars(points, profile.binCm * 0.9, INK.green)
    .toString();
}

/** Licks a second of time spent at each position: those that wait for water, and all. */
export function lickRate(shown: Shown): string {
  const { profile, licking, laps } = shown;
  const { bins, binCm } = profile;
  const inside = new Set(laps.map(({ lap }) => lap));
  const seconds = secondsByBin(profile);
  const rate = (list: Licking['before']): Point[] => {
    const counts = new Float64Array(bins);
    for (const { lap, positionCm } of list)
      if (positionCm !== null && inside.has(lap))
        counts[Math.min(bins - 1, Math.floor(positionCm / binCm))]!++;
    return Array.from(counts, (c, i): Point => [(i + 0.5) * binCm, c / seconds[i]!]);
  };
  const before = rate(licking.before);
  const all = rate([...licking.before, ...licking.drinking]);
  const y = { label: 'licks (1/s)', from: 0, to: top(all.map(([, r]) => r)) };
  return onBelt(new Plot('Lick rate by position', belt(shown), y, 200), shown)
    .curve(all, INK.grey, '3 3')
    .curve(before, INK.black)
    .toString();
}

export function secondsByBin({ laps, bins }: Profile): number[] {
  return Array.from({ length: bins }, (_, bin) =>
    laps.reduce((sum, lap) => sum + lap.seconds[bin]!, 0),
  );
}

/** Of the licks that wait for water: the share in the spout's place, and in the approach before. */
export function lickShares(shown: Shown): string {
  const y = { label: 'share of licks', from: 0, to: 1 };
  const rows = shown.licking.laps.filter(({ licks }) => licks > 0);
  return new Plot('Share of licks at the spout and before it, by lap', lapAxis(shown), y, 180)
    .marks(
      rows.map((r) => [r.lap, r.inSpout / r.licks]),
      'dot',
      INK.blue,
    )
    .marks(
      rows.map((r) => [r.lap, r.inApproach / r.licks]),
      'ring',
      INK.orange,
    )
    .toString();
}

export function firstLicks(shown: Shown): string {
  const y = { label: 'first lick (cm)', from: 0, to: shown.lengthCm };
  const rows = shown.licking.laps.filter(({ firstCm }) => firstCm !== null);
  return new Plot('Place of the first lick of each lap', lapAxis(shown), y, 180)
    .marks(
      rows.map((r) => [r.lap, r.firstCm!]),
      'dot',
      INK.black,
    )
    .toString();
}

/** Speed in the approach over speed elsewhere: below 1 the animal slows before the spout. */
export function slowing(shown: Shown): string {
  const rows = shown.licking.laps.filter((r) => Number.isFinite(r.slowing));
  const y = {
    label: 'approach / elsewhere',
    from: 0,
    to: top([1.2, ...rows.map((r) => r.slowing)]),
  };
  const axis = lapAxis(shown);
  return new Plot('Speed before the spout over speed elsewhere, by lap', axis, y, 180)
    .curve(
      [
        [axis.from, 1],
        [axis.to, 1],
      ],
      INK.grey,
      '3 3',
    )
    .marks(
      rows.map((r) => [r.lap, r.slowing]),
      'dot',
      INK.black,
    )
    .toString();
}

export function slips(shown: Shown): string {
  const points = shown.laps.flatMap(({ lap, slipMm }): Point[] =>
    slipMm === null ? [] : [[lap, slipMm]],
  );
  const most = Math.max(2, ...points.map(([, slip]) => Math.abs(slip))) * 1.1;
  const y = { label: 'slip (mm)', from: -most, to: most };
  const axis = lapAxis(shown);
  return new Plot('Slip found at the end of each lap', axis, y, 160)
    .curve(
      [
        [axis.from, 0],
        [axis.to, 0],
      ],
      INK.grey,
      '3 3',
    )
    .marks(points, 'dot', INK.black)
    .toString();
}

/** Water given so far, at the end of each lap. */
export function water(shown: Shown): string {
  // Every drop counts here, those of laps that were left out or cut short too.
  const points = shown.laps.map(({ lap }): Point => {
    const given = shown.drops.filter((drop) => drop.lap <= lap);
    return [lap, given.reduce((sum, { volumeUl }) => sum + volumeUl, 0)];
  });
  const sum = points.at(-1)?.[1] ?? 0;
  const y = { label: 'water so far (uL)', from: 0, to: top([1, sum]) };
  return new Plot('Water given so far, by lap', lapAxis(shown), y, 160)
    .curve(points, INK.blue)
    .toString();
}
