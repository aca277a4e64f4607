import type { AnimalTold, DayWater } from '../../../server/web/animals/animalsMessages.js';
import { hadParts, millilitres } from '../../model/animals.js';
import { ScrollBox } from './scrollBox.js';

const WIDE = 640;
const HIGH = 170;
const LEFT = 44;
const RIGHT = 12;
const TOP = 12;
const BOTTOM = 26;

/** Each of the last days: earned and drunk, perhaps not drunk, by hand; and that day's target. */
export function WaterChart({ animal }: { animal: AnimalTold }) {
  const { days } = animal;
  const top = Math.max(200, ...days.map((day) => Math.max(totalUl(day), day.targetUl ?? 0))) * 1.1;
  const step = (WIDE - LEFT - RIGHT) / days.length;
  const y = (ul: number) => TOP + (1 - ul / top) * (HIGH - TOP - BOTTOM);
  const tickUl = niceStep(top);
  const ticks = Array.from({ length: Math.floor(top / tickUl) + 1 }, (_, n) => n * tickUl);
  const today = days.at(-1)!;
  return (
    <>
      <svg
        class="animal-chart"
        viewBox={`0 0 ${WIDE} ${HIGH}`}
        role="img"
        aria-label={`Water of the last ${days.length} days; today ${hadParts(today).join(', ') || 'none'}`}
      >
        {ticks.map((ul) => (
          <g key={ul}>
            <path class="grid-line" d={`M${LEFT} ${y(ul)}H${WIDE - RIGHT}`} />
            <text class="tick-word" x={LEFT - 6} y={y(ul) + 4}>
              {(ul / 1_000).toFixed(tickUl < 1_000 ? 1 : 0)}
            </text>
          </g>
        ))}
        {days.map((day, n) => (
          <Bar key={day.day} day={day} x={LEFT + n * step} wide={step} y={y} />
        ))}
        <text class="tick-word start" x={LEFT} y={HIGH - 8}>
          {days[0]!.day}
        </text>
        <text class="tick-word" x={WIDE - RIGHT} y={HIGH - 8}>
          {today.day}
        </text>
      </svg>
      <ul class="chart-key">
        <li>
          <span class="swatch earned" /> earned
        </li>
        <li>
          <span class="swatch unlicked" /> perhaps not drunk, or uncertain
        </li>
        <li>
          <span class="swatch hand" /> by hand
        </li>
        <li>
          <span class="swatch target" /> target
        </li>
      </ul>
      <details>
        <summary>Days as a table</summary>
        <ScrollBox label="Days as a table">
          <table class="small-rows animals-table">
            <thead>
              <tr>
                <th scope="col">Day</th>
                <th scope="col">Water</th>
                <th scope="col">Target</th>
              </tr>
            </thead>
            <tbody>
              {[...days].reverse().map((day) => (
                <tr key={day.day}>
                  <th scope="row">{day.day}</th>
                  <td>{hadParts(day).join(', ') || 'none'}</td>
                  <td>{day.targetUl === null ? '–' : millilitres(day.targetUl)}</td>
                </tr>
              ))}
            </tbody>
          </table>
        </ScrollBox>
      </details>
    </>
  );
}

function Bar(props: { day: DayWater; x: number; wide: number; y: (ul: number) => number }) {
  const { day, x, wide, y } = props;
  const unsure = day.notLickedUl + day.uncertainUl;
  const parts = [
    ['hand', day.byHandUl],
    ['earned', day.earnedUl - day.notLickedUl],
    ['unlicked', unsure],
  ] as const;
  let below = 0;
  return (
    <g>
      {parts.map(([name, ul]) => {
        if (ul <= 0) return null;
        const from = below;
        below += ul;
        return (
          <rect
            key={name}
            class={`water-bar ${name}`}
            x={x + wide * 0.15}
            y={y(below)}
            width={wide * 0.7}
            height={y(from) - y(below)}
          />
        );
      })}
      {day.targetUl === null ? null : (
        <path class="target-line" d={`M${x} ${y(day.targetUl)}h${wide}`} />
      )}
    </g>
  );
}

function totalUl({ earnedUl, uncertainUl, byHandUl }: DayWater): number {
  return earnedUl + uncertainUl + byHandUl;
}

/** A step of 1, 2 or 5 that makes three to six of them. */
function niceStep(top: number): number {
  const size = 10 ** Math.floor(Math.log10(top / 3));
  return [5, 2, 1].map((n) => n * size).find((step) => top / step >= 2.5) ?? size;
}
