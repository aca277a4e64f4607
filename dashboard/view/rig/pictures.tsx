import type { Picture } from '../../../server/calibrate/guides/guide.js';
import { fixed } from '../../model/format.js';

const WIDE = 420;
const HIGH = 170;
const LEFT = 44;
const RIGHT = 10;
const TOP = 12;
const BOTTOM = 26;

/** What a guide has measured, drawn; its sentences have the figures. */
export function PictureView({ picture }: { picture: Picture }) {
  return (
    <figure class="measured">
      <figcaption>{picture.title}</figcaption>
      {picture.draw === 'laps' ? <Laps picture={picture} /> : null}
      {picture.draw === 'line' ? <Line picture={picture} /> : null}
      {picture.draw === 'histogram' ? <Histogram picture={picture} /> : null}
    </figure>
  );
}

function Frame(props: { label: string; children: preact.ComponentChildren }) {
  return (
    <svg viewBox={`0 0 ${WIDE} ${HIGH}`} role="img" aria-label={props.label}>
      <path class="axis" d={`M${LEFT} ${TOP}V${HIGH - BOTTOM}H${WIDE - RIGHT}`} />
      {props.children}
    </svg>
  );
}

/** Each lap against the median; outlying ones as crosses at the picture's edge. */
function Laps({ picture }: { picture: Extract<Picture, { draw: 'laps' }> }) {
  const { laps, median, unit } = picture;
  const inlying = laps.filter((lap) => !lap.outlying).map((lap) => Math.abs(lap.counts - median));
  const most = Math.max(1, ...inlying) * 1.2;
  const middle = (TOP + HIGH - BOTTOM) / 2;
  const half = (HIGH - BOTTOM - TOP) / 2;
  const x = (n: number) => LEFT + ((n + 0.5) / laps.length) * (WIDE - LEFT - RIGHT);
  const y = (counts: number) => middle - Math.max(-1, Math.min(1, (counts - median) / most)) * half;
  const out = laps.filter((lap) => lap.outlying).length;
  return (
    <Frame label={`${laps.length} laps about ${fixed(median, 1)} ${unit}; ${out} lie out`}>
      <path class="middle" d={`M${LEFT} ${middle}H${WIDE - RIGHT}`} />
      <Tick y={middle} words={fixed(median, 1)} />
      <Tick y={TOP + 4} words={`+${fixed(most, 1)}`} />
      <Tick y={HIGH - BOTTOM} words={`−${fixed(most, 1)}`} />
      {laps.map(({ counts, outlying }, n) =>
        outlying ? (
          <path key={x(n)} class="out" d={`M${x(n) - 4} ${y(counts) - 4}l8 8m0 -8l-8 8`} />
        ) : (
          <circle key={x(n)} class="dot" cx={x(n)} cy={y(counts)} r="3.5" />
        ),
      )}
      <text class="tick-word across" x={WIDE - RIGHT} y={HIGH - 8}>
        lap {laps.length}
      </text>
    </Frame>
  );
}

/** Points with their line and its band. */
function Line({ picture }: { picture: Extract<Picture, { draw: 'line' }> }) {
  const { points, offset, slope, xUnit, yUnit } = picture;
  const mostX = Math.max(...points.map((point) => point.x)) * 1.05;
  const mostY = Math.max(...points.map((point) => point.y)) * 1.1;
  const x = (value: number) => LEFT + (value / mostX) * (WIDE - LEFT - RIGHT);
  const y = (value: number) => HIGH - BOTTOM - (value / mostY) * (HIGH - BOTTOM - TOP);
  const sorted = [...points].sort((a, b) => a.x - b.x);
  const edge = (sign: number) =>
    sorted.map((point) => `${x(point.x)},${y(offset + slope * point.x + sign * point.band)}`);
  const from = Math.max(0, -offset / slope);
  return (
    <Frame label={`Volume against open time, ${points.length} points and their line`}>
      <polygon class="band" points={[...edge(1), ...edge(-1).reverse()].join(' ')} />
      <path class="middle" d={`M${x(from)} ${y(0)}L${x(mostX)} ${y(offset + slope * mostX)}`} />
      {points.map((point) => (
        <circle key={`${point.x} ${point.y}`} class="dot" cx={x(point.x)} cy={y(point.y)} r="3.5" />
      ))}
      <Tick y={TOP + 4} words={`${fixed(mostY, 1)}`} />
      <Tick y={HIGH - BOTTOM} words="0" />
      <text class="tick-word across" x={WIDE - RIGHT} y={HIGH - 8}>
        {yUnit} against {xUnit}, to {fixed(mostX, 0)} {xUnit}
      </text>
    </Frame>
  );
}

function Histogram({ picture }: { picture: Extract<Picture, { draw: 'histogram' }> }) {
  const { edges, counts, marks, unit, title } = picture;
  const first = Math.max(0, counts.findIndex((count) => count > 0) - 1);
  const last = Math.min(counts.length - 1, lastFilled(counts) + 1);
  const shown = counts.slice(first, last + 1);
  const most = Math.max(1, ...shown);
  const bar = (WIDE - LEFT - RIGHT) / shown.length;
  const y = (count: number) => HIGH - BOTTOM - (count / most) * (HIGH - BOTTOM - TOP - 12);
  // Bins grow by a constant factor, so place goes by the logarithm.
  const [low, high] = [Math.log(edges[first]!), Math.log(edges[last + 1]!)];
  const place = (value: number) =>
    LEFT + ((Math.log(Math.max(value, 1e-9)) - low) / (high - low)) * (WIDE - LEFT - RIGHT);
  const total = shown.reduce((sum, count) => sum + count, 0);
  return (
    <Frame label={`${title}: ${total} in all, ${unit}`}>
      {shown.map((count, n) => (
        <rect
          key={edges[first + n]}
          class="bin"
          x={LEFT + n * bar + 0.5}
          y={y(count)}
          width={Math.max(1, bar - 1)}
          height={HIGH - BOTTOM - y(count)}
        />
      ))}
      {marks
        .filter(({ at }) => place(at) >= LEFT && place(at) <= WIDE - RIGHT)
        .map(({ at, label }, n) => (
          <g key={label}>
            <path class="mark-line" d={`M${place(at)} ${TOP + 12 * n}V${HIGH - BOTTOM}`} />
            <text
              class={`mark-word ${place(at) > WIDE - 90 ? 'before' : ''}`}
              x={place(at) + (place(at) > WIDE - 90 ? -4 : 4)}
              y={TOP + 9 + 12 * n}
            >
              {label}
            </text>
          </g>
        ))}
      <Tick y={TOP + 16} words={String(most)} />
      <text class="tick-word" x={LEFT} y={HIGH - 8}>
        {fixed(edges[first]!, 0)}
      </text>
      <text class="tick-word across" x={WIDE - RIGHT} y={HIGH - 8}>
        {fixed(edges[last + 1]!, 0)} {unit}
      </text>
    </Frame>
  );
}

function lastFilled(counts: readonly number[]): number {
  for (let n = counts.length - 1; n > 0; n--) if (counts[n]! > 0) return n;
  return 0;
}

function Tick({ y, words }: { y: number; words: string }) {
  return (
    <text class="tick-word up" x={LEFT - 6} y={y + 4}>
      {words}
    </text>
  );
}
