import { fixed } from '../model/format.js';
import type { Live } from '../model/live.js';

const WIDTH = 400;
const HEIGHT = 84;
const BASE = 68;
const TOP = 8;

/** The field that the last induction is predicted to leave, a second after it; nothing before. */
export function FieldPanel({ live }: { live: Live }) {
  const { field } = live;
  const lengthCm = live.setup?.beltLengthCm ?? 0;
  if (field === undefined || lengthCm === 0) return null;
  const side = field.shiftCm < 0 ? 'after' : 'before';
  const words =
    `Peak at ${fixed(field.peakCm, 0)} cm, ${fixed(Math.abs(field.shiftCm), 0)} cm ${side} the onset ` +
    `at ${fixed(field.onsetCm, 0)} cm; ${fixed(field.widthCm, 0)} cm wide.`;
  const x = (cm: number) => (cm / lengthCm) * WIDTH;
  return (
    <section class="panel field-panel" aria-labelledby="field-title">
      <h2 id="field-title">
        Predicted field, {field.rule} on lap {field.lap}
      </h2>
      <svg viewBox={`0 0 ${WIDTH} ${HEIGHT}`} role="img" aria-label={words}>
        <path class="curve" d={pathOf(field.curve)} />
        <path class="belt" d={`M0 ${BASE}H${WIDTH}`} />
        <path class="onset" d={`M${x(field.onsetCm)} ${TOP}V${BASE}`} />
        <text x={0} y={HEIGHT - 2}>
          0
        </text>
        <text x={WIDTH} y={HEIGHT - 2} text-anchor="end">
          {fixed(lengthCm, 0)} cm
        </text>
      </svg>
      <p>{words}</p>
      <p class="hint">Predicted from the run, not measured; the dashed line is the onset.</p>
    </section>
  );
}

function pathOf(curve: readonly number[]): string {
  const points = curve.map((share, n) => {
    const x = ((n + 0.5) * WIDTH) / curve.length;
    return `${x.toFixed(1)} ${(BASE - share * (BASE - TOP)).toFixed(1)}`;
  });
  return `M${points.join('L')}`;
}
