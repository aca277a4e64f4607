import type { DayTold } from '../../../server/web/records/recordsMessages.js';
import { fixed } from '../../model/format.js';

const WIDE = 260;
const HIGH = 96;
const LEFT = 34;
const EDGE = 8;

/** One number of each session, in their order. The table beside it has the figures. */
export function TrendPlot(props: {
  days: readonly DayTold[];
  label: string;
  of: (day: DayTold) => number | null;
  most?: number;
}) {
  const { days, label, of } = props;
  const values = days.map(of);
  const known = values.filter((value): value is number => value !== null);
  const top = props.most ?? Math.max(1e-9, ...known) * 1.1;
  const x = (n: number) => LEFT + ((n + 0.5) / days.length) * (WIDE - LEFT - EDGE);
  const y = (value: number) => HIGH - EDGE - (value / top) * (HIGH - 2 * EDGE);
  const points = values.flatMap((value, n) => (value === null ? [] : [[x(n), y(value)] as const]));
  const first = known[0];
  const last = known.at(-1);
  return (
    <figure class="trend">
      <figcaption>{label}</figcaption>
      <svg
        viewBox={`0 0 ${WIDE} ${HIGH}`}
        role="img"
        aria-label={`${label}: from ${fixed(first, 2)} in the first session to ${fixed(last, 2)} in the last`}
      >
        <path class="axis" d={`M${LEFT} ${EDGE}V${HIGH - EDGE}H${WIDE - EDGE}`} />
        <text x={LEFT - 5} y={EDGE + 8} class="tick-word">
          {top >= 10 ? top.toFixed(0) : top.toFixed(1)}
        </text>
        <text x={LEFT - 5} y={HIGH - EDGE} class="tick-word">
          0
        </text>
        <polyline class="trend-line" points={points.map((point) => point.join(',')).join(' ')} />
        {points.map(([cx, cy]) => (
          <circle key={cx} class="trend-dot" cx={cx} cy={cy} r="3.4" />
        ))}
      </svg>
    </figure>
  );
}
