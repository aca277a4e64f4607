import type { Spread } from '../../../server/rehearse/runsReport.js';

/** A hundred units across, so that places on it are percentages. */
const WIDTH = 100;
const HEIGHT = 26;
const BASE = 19;

/**
 * How a quantity is spread over the sessions: a column for each part of its range, below them the
 * middle nine tenths as a beam with the median on it. The numbers beside it say the same.
 */
export function SpreadPlot({ spread }: { spread: Spread }) {
  const { least, low, median, high, most, bins } = spread;
  const range = most - least;
  const at = (value: number) => (range === 0 ? WIDTH / 2 : ((value - least) / range) * WIDTH);
  const tallest = Math.max(...bins);
  const step = WIDTH / bins.length;
  const shown = range === 0 ? [] : bins;
  return (
    <svg
      class="spread"
      viewBox={`0 0 ${WIDTH} ${HEIGHT}`}
      preserveAspectRatio="none"
      aria-hidden="true"
    >
      {shown.map((count, n) =>
        count === 0 ? null : (
          <rect
            key={n}
            class="column"
            x={n * step + step * 0.08}
            width={step * 0.84}
            y={BASE - 1 - (count / tallest) * (BASE - 2)}
            height={(count / tallest) * (BASE - 2)}
          />
        ),
      )}
      <rect class="ground" x={0} y={BASE + 2} width={WIDTH} height={1} />
      <rect
        class="beam"
        x={Math.min(at(low), WIDTH - 1)}
        y={BASE + 1}
        width={Math.max(1, at(high) - at(low))}
        height={3}
      />
      <rect
        class="median"
        x={Math.min(WIDTH - 1.2, Math.max(0, at(median) - 0.6))}
        y={BASE - 1}
        width={1.2}
        height={7}
      />
    </svg>
  );
}

/** A share of sessions as a bar. */
export function ShareBar({ share }: { share: number }) {
  return (
    <svg class="share-bar" viewBox="0 0 100 10" preserveAspectRatio="none" aria-hidden="true">
      <rect class="ground" x={0} y={2} width={100} height={6} />
      <rect class="beam" x={0} y={2} width={share * 100} height={6} />
    </svg>
  );
}

/** `12 (9 to 15)`, with as many decimals as the quantity deserves. */
export function spreadWords({ low, median, high }: Spread, decimals = 0): string {
  const [from, middle, to] = [low, median, high].map((value) => value.toFixed(decimals));
  return from === to ? `${middle}, always` : `${middle} (${from} to ${to})`;
}
