import type { SessionData } from '../../analysis/readSession.js';
import { INPUT_TUNING_CM } from '../../plasticity/kernel.js';
import type { Decision, Stamp } from '../../session/decisions.js';
import { fixed, table } from './htmlTable.js';
import { INK, Plot, type Point } from './plot.js';

type Predicted = Stamp & Extract<Decision, { kind: 'field predicted' }>;

/** Drawn at most, the first of them: more curves than this cannot be told apart. */
const MOST_CURVES = 12;

/** The fields that the session's inductions are predicted to leave; empty where there was none. */
export function predictedFields({ decisions, rig }: SessionData): string {
  const fields = decisions.filter((d): d is Predicted => d.kind === 'field predicted');
  if (fields.length === 0) return '';
  const rows = fields.map((field) => [
    ...[field.rule, field.serial, field.lap, fixed(field.onsetCm, 1), fixed(field.peakCm, 1)],
    ...[fixed(field.centreCm, 1), fixed(field.widthCm, 1), fixed(field.shiftCm, 1)],
    fixed(field.asymmetry, 2),
  ]);
  return [
    '<h2>Fields predicted from the run</h2>',
    `<figure>${drawn(fields, rig.belt.lengthCm)}<figcaption>Each induction's predicted field as a ` +
      'share of its peak' +
      (fields.length > MOST_CURVES ? ` (the first ${MOST_CURVES} of ${fields.length})` : '') +
      '; dots at the onset. Blue: the mean of all.</figcaption></figure>',
    table(
      [
        ...['rule', 'no.', 'lap', 'onset (cm)', 'peak (cm)', 'centre (cm)', 'width (cm)'],
        ...['before the onset (cm)', 'asymmetry'],
      ],
      rows,
      'wide fields',
    ),
    '<p>Predicted, not measured: the places occupied from 3 s before to 1 s after each firing, ' +
      'weighted by a double exponential window of plasticity (1.3 s before, 0.7 s after the onset; ' +
      `from memory of a publication) and spread by the inputs' place tuning (SD ${INPUT_TUNING_CM} cm, ` +
      'entering twice). Assumes one plateau at each firing, inputs spread evenly over the belt and a ' +
      'cell without a field before. Width: where it falls to a fifth of its peak.</p>',
  ].join('\n');
}

function drawn(fields: readonly Predicted[], lengthCm: number): string {
  const x = { label: 'position on the belt (cm)', from: 0, to: lengthCm };
  const y = { label: 'share of peak', from: 0, to: 1.05 };
  const plot = new Plot('Predicted fields by position on the belt', x, y);
  const points = (curve: readonly number[]): Point[] =>
    curve.map((share, n) => [((n + 0.5) * lengthCm) / curve.length, share]);
  const shown = fields.slice(0, MOST_CURVES);
  for (const { curve } of shown) plot.curve(points(curve), INK.grey);
  const mean = fields[0]!.curve.map(
    (_, n) => fields.reduce((sum, { curve }) => sum + curve[n]!, 0) / fields.length,
  );
  plot.curve(points(mean), INK.blue);
  return plot
    .marks(
      shown.map(({ onsetCm }): Point => [onsetCm, 0]),
      'dot',
      INK.orange,
    )
    .toString();
}
