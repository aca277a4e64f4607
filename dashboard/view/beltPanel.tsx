import { useCallback } from 'preact/hooks';
import type { ChartName, Charts } from '../draw/charts.js';
import { fixed, plural } from '../model/format.js';
import { LAPS_KEPT, MARK, type Mark } from '../model/laps.js';
import type { Live } from '../model/live.js';
import { PROFILE_LAPS } from '../model/profile.js';
import { MarkShape } from './shapes.js';

const LEGEND: readonly [Mark, string][] = [
  [MARK.lick, 'lick'],
  [MARK.water, 'water'],
  [MARK.stimulus, 'stimulus'],
  [MARK.sham, 'sham'],
  [MARK.missed, 'missed'],
  [MARK.withheld, 'withheld or refused'],
];

/** Belt, laps and profile over one x axis, so that the eye runs straight down from the animal. */
export function BeltPanel({ live, charts }: { live: Live; charts: Charts }) {
  return (
    <section class="panel belt-panel" aria-labelledby="belt-title">
      <h2 id="belt-title">Belt and laps</h2>
      <Legend />
      <div class="stack strip" role="img" aria-label={beltWords(live)}>
        <Canvas name="belt" charts={charts} />
        <Canvas name="animal" charts={charts} />
      </div>
      <div class="stack raster" role="img" aria-label={lapsWords(live)}>
        <Canvas name="raster" charts={charts} />
        <Canvas name="running" charts={charts} />
        {live.laps.newest < 0 ? (
          <p class="empty">Laps appear here, the running one on top.</p>
        ) : null}
      </div>
      <h3>
        Speed by position, cm/s{' '}
        <span class="keys">
          <span class="dashed">first {PROFILE_LAPS} laps</span>
          <span class="solid">last {PROFILE_LAPS} laps</span>
        </span>
      </h3>
      <div
        class="stack profile"
        role="img"
        aria-label="Mean speed by position, the first laps beside the last ones"
      >
        <Canvas name="profile" charts={charts} />
      </div>
      <h3>
        Licks per lap by position{' '}
        <span class="keys">
          <span class="dashed">first {PROFILE_LAPS} laps</span>
          <span class="bars">last {PROFILE_LAPS} laps</span>
        </span>
      </h3>
      <div
        class="stack profile licking"
        role="img"
        aria-label="Licks per lap by position, the first laps beside the last ones"
      >
        <Canvas name="licking" charts={charts} />
      </div>
    </section>
  );
}

/** What each kind of mark looks like. */
export function Legend() {
  return (
    <ul class="legend">
      {LEGEND.map(([kind, word]) => (
        <li key={word}>
          <MarkShape kind={kind} />
          {word}
        </li>
      ))}
    </ul>
  );
}

export function SpeedPanel({ charts }: { charts: Charts }) {
  const attach = useCallback((box: HTMLElement | null) => charts.attachPlot(box), [charts]);
  return (
    <section class="panel speed-panel" aria-labelledby="speed-title">
      <h2 id="speed-title">Speed, last minute, cm/s</h2>
      <div class="plot" role="img" aria-label="Speed over the last minute" ref={attach} />
    </section>
  );
}

function Canvas({ name, charts }: { name: ChartName; charts: Charts }) {
  const attach = useCallback(
    (canvas: HTMLCanvasElement | null) => charts.attach(name, canvas),
    [name, charts],
  );
  return <canvas ref={attach} />;
}

function beltWords({ state, setup }: Live): string {
  const places = (state?.places ?? []).map((place) =>
    place.fromCm === place.toCm
      ? `${place.name} at ${fixed(place.fromCm, 1)} cm`
      : `${place.name} from ${fixed(place.fromCm, 1)} to ${fixed(place.toCm, 1)} cm`,
  );
  const length = setup ? `Belt of ${setup.beltLengthCm} cm` : 'Belt';
  return `${length}. Places: ${places.join(', ') || 'none'}.`;
}

function lapsWords({ laps }: Live): string {
  const shown = Math.min(LAPS_KEPT, Math.max(0, laps.newest + 1));
  const before = laps.get(laps.newest - 1);
  if (!before) return `Licks and firings by position, ${plural(shown, 'lap')}.`;
  const count = (kind: Mark) => before.totals[kind] ?? 0;
  return (
    `Licks and firings by position, ${plural(shown, 'lap')}. Lap ${before.lap}: ` +
    `${plural(count(MARK.lick), 'lick')}, ${plural(count(MARK.stimulus), 'stimulus', 'stimuli')}, ` +
    `${plural(count(MARK.sham), 'sham')}, ${plural(count(MARK.water), 'drop')} of water.`
  );
}
