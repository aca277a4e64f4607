import { type ErrorSpread, spreadOf } from '../model/firingErrors.js';
import { fixed, plural } from '../model/format.js';
import type { Live } from '../model/live.js';

const WIDTH = 400;
const HEIGHT = 118;
const ROW = 48;
const BAR = 34;

/** How near the firings were to their places, the board's and the host's apart; nothing before any. */
export function ErrorsPanel({ live }: { live: Live }) {
  const { errors } = live;
  const { scaleMm } = errors;
  const board = spreadOf(errors.board, scaleMm);
  const host = spreadOf(errors.host, scaleMm);
  if (board === undefined && host === undefined) return null;
  const words = [told('started by the board', board), told('by the host', host)];
  return (
    <section class="panel errors-panel" aria-labelledby="errors-title">
      <h2 id="errors-title">Firings, from their places</h2>
      <svg viewBox={`0 0 ${WIDTH} ${HEIGHT}`} role="img" aria-label={words.join('; ')}>
        <path class="place" d={`M${WIDTH / 2} 0V${2 * ROW}`} />
        <Bars kind="board" spread={board} base={ROW} />
        <Bars kind="host" spread={host} base={2 * ROW} />
        <text x={0} y={HEIGHT - 4}>
          {fixed(scaleMm, scaleMm < 1 ? 1 : 0)} mm before
        </text>
        <text x={WIDTH / 2} y={HEIGHT - 4} text-anchor="middle">
          place
        </text>
        <text x={WIDTH} y={HEIGHT - 4} text-anchor="end">
          after {fixed(scaleMm, scaleMm < 1 ? 1 : 0)} mm
        </text>
      </svg>
      {words.map((line) => (
        <p key={line}>{line}</p>
      ))}
    </section>
  );
}

interface BarsProps {
  readonly kind: 'board' | 'host';
  readonly spread: ErrorSpread | undefined;
  readonly base: number;
}

/** The fullest bin is as high as its row; each row has its own name, so that colour is not needed. */
function Bars({ kind, spread, base }: BarsProps) {
  const bins = spread?.bins ?? [];
  const most = Math.max(1, ...bins);
  const wide = WIDTH / Math.max(1, bins.length);
  const bars = bins.map((count, n) => {
    const high = (count / most) * BAR;
    return count === 0 ? '' : `M${n * wide + 1} ${base}v${-high}h${wide - 2}v${high}z`;
  });
  return (
    <>
      <text x={0} y={base - BAR}>
        {kind}
      </text>
      <path class="belt" d={`M0 ${base}H${WIDTH}`} />
      <path class={`bars ${kind}`} d={bars.join('')} />
    </>
  );
}

function told(how: string, spread: ErrorSpread | undefined): string {
  if (spread === undefined) return `none ${how}`;
  const { count, medianMm, mostMm } = spread;
  return `${plural(count, 'firing')} ${how}: median ${fixed(medianMm, 2)} mm, most ${fixed(mostMm, 2)} mm`;
}
