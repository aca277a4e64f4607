import type { AnimalTold } from '../../../server/web/animals/animalsMessages.js';
import { LEVEL_WORDS, LEVELS } from '../../model/animals.js';
import { fixed } from '../../model/format.js';
import { ScrollBox } from './scrollBox.js';

const WIDE = 640;
const HIGH = 190;
const LEFT = 44;
const RIGHT = 12;
const TOP = 12;
const BOTTOM = 26;
const DAY_MS = 86_400_000;
/** As many weighings as can be told apart. */
const MOST = 90;

/** Percent of the corrected baseline over days, with the alarm level. The table has the figures. */
export function WeightChart({ animal }: { animal: AnimalTold }) {
  const known = animal.weights.filter(({ percent }) => percent !== null).slice(-MOST);
  const weights = animal.weights.slice(-MOST);
  if (weights.length === 0) return <p class="empty">It has not been weighed yet.</p>;
  return (
    <>
      {known.length === 0 ? (
        <p class="empty">Without a baseline there is no percent to draw.</p>
      ) : (
        <Drawing animal={animal} known={known} />
      )}
      <details>
        <summary>Weights as a table</summary>
        <ScrollBox label="Weights as a table">
          <table class="small-rows animals-table">
            <thead>
              <tr>
                <th scope="col">Day</th>
                <th scope="col">g</th>
                <th scope="col">%</th>
                <th scope="col">Level</th>
              </tr>
            </thead>
            <tbody>
              {[...weights].reverse().map(({ at, day, grams, percent, level }) => (
                <tr key={at}>
                  <th scope="row">{day}</th>
                  <td>{fixed(grams, 1)}</td>
                  <td>{fixed(percent, 1)}</td>
                  <td>{LEVEL_WORDS[level]}</td>
                </tr>
              ))}
            </tbody>
          </table>
        </ScrollBox>
      </details>
    </>
  );
}

function Drawing({ animal, known }: { animal: AnimalTold; known: AnimalTold['weights'] }) {
  const least = animal.card.leastPercent;
  const percents = known.map(({ percent }) => percent!);
  const low = Math.min(least, ...percents) - 3;
  const high = Math.max(100, ...percents) + 2;
  const times = known.map(({ at }) => Date.parse(at));
  const first = Math.min(times[0]!, times.at(-1)! - 6 * DAY_MS);
  const x = (ms: number) =>
    LEFT + ((ms - first) / Math.max(DAY_MS, times.at(-1)! - first)) * (WIDE - LEFT - RIGHT);
  const y = (percent: number) => TOP + ((high - percent) / (high - low)) * (HIGH - TOP - BOTTOM);
  const points = known.map(({ percent }, n) => [x(times[n]!), y(percent!)] as const);
  const last = known.at(-1)!;
  return (
    <svg
      class="animal-chart"
      viewBox={`0 0 ${WIDE} ${HIGH}`}
      role="img"
      aria-label={`${known.length} weighings from ${known[0]!.day} to ${last.day}; the last ${fixed(last.percent, 1)} %, the alarm level ${least} %`}
    >
      <rect
        class="below"
        x={LEFT}
        y={y(least)}
        width={WIDE - LEFT - RIGHT}
        height={HIGH - BOTTOM - y(least)}
      />
      {[100, 90, least].map((percent) => (
        <g key={percent}>
          <path
            class={percent === least ? 'limit-line' : 'grid-line'}
            d={`M${LEFT} ${y(percent)}H${WIDE - RIGHT}`}
          />
          <text class="tick-word" x={LEFT - 6} y={y(percent) + 4}>
            {percent} %
          </text>
        </g>
      ))}
      <polyline class="weight-line" points={points.map((point) => point.join(',')).join(' ')} />
      {points.map(([cx, cy], n) => (
        <Dot key={times[n]} cx={cx} cy={cy} level={LEVELS[known[n]!.level]} />
      ))}
      <text class="tick-word start" x={LEFT} y={HIGH - 8}>
        {animal.weights.length > 1 ? known[0]!.day : ''}
      </text>
      <text class="tick-word" x={WIDE - RIGHT} y={HIGH - 8}>
        {last.day}
      </text>
    </svg>
  );
}

/** The shapes of the levels: disc, triangle, square. */
function Dot({ cx, cy, level }: { cx: number; cy: number; level: string }) {
  if (level === 'bad') return <rect class="dot bad" x={cx - 4} y={cy - 4} width="8" height="8" />;
  if (level === 'warn') {
    return <path class="dot warn" d={`M${cx} ${cy - 5}l5 9h-10z`} />;
  }
  return <circle class="dot good" cx={cx} cy={cy} r="3.6" />;
}
