import type { BeltStretch, Outlined } from '../../../server/web/rules/rulesMessages.js';
import { tickStep } from '../../draw/axis.js';
import { itemAt, type Rehearse, spotsWords } from '../../model/rehearse.js';
import type { Desk } from './desk.js';

/** The belt, seam to seam, once for each place and rule, with where on it they are. */
export function BeltRows({ desk, state }: { desk: Desk; state: Rehearse }) {
  const outline = state.check?.outline ?? null;
  const beltCm = outline?.beltCm || state.rig?.beltCm || 0;
  const current = itemAt(outline, state.cursor);
  const group = (title: string, items: readonly Outlined[]) =>
    items.length === 0 ? null : (
      <>
        <h3>{title}</h3>
        <ul class="belt-rows">
          {items.map((item) => (
            <li key={item.name}>
              <BeltRow item={item} beltCm={beltCm} desk={desk} current={item === current} />
            </li>
          ))}
        </ul>
      </>
    );
  return (
    <section class="panel" aria-labelledby="places-title">
      <h2 id="places-title">On the belt</h2>
      {beltCm > 0 && outline ? (
        <>
          <Ruler beltCm={beltCm} />
          {group('Places', outline.places)}
          {group('Rules', outline.rules)}
        </>
      ) : (
        <p class="empty">The belt appears here as soon as the outline of the file can be read.</p>
      )}
    </section>
  );
}

interface RowProps {
  readonly item: Outlined;
  readonly beltCm: number;
  readonly desk: Desk;
  readonly current: boolean;
}

function BeltRow({ item, beltCm, desk, current }: RowProps) {
  return (
    <button
      type="button"
      class={`belt-row ${current ? 'current' : ''}`}
      aria-current={current ? 'true' : undefined}
      title={item.words}
      onFocus={() => desk.goTo(item.from)}
      onPointerEnter={(event) => {
        // A row that moved under a resting pointer was not pointed at.
        if (event.movementX !== 0 || event.movementY !== 0) desk.goTo(item.from);
      }}
      onClick={() => {
        desk.goTo(item.from);
        desk.onFocus();
      }}
    >
      <span class="row-name">{item.name}</span>
      <span class="row-line">
        <span class="unseen">, line </span>
        {item.line}
        <span class="unseen">
          : {item.words}. On the belt {spotsWords(item.spots)}.
        </span>
      </span>
      <Track spots={item.spots} beltCm={beltCm} />
    </button>
  );
}

/** Drawn in cm by cm, stretched to the width that there is. */
function Track({ spots, beltCm }: { spots: readonly BeltStretch[]; beltCm: number }) {
  return (
    <svg class="track" viewBox={`0 0 ${beltCm} 10`} preserveAspectRatio="none" aria-hidden="true">
      <rect class="belt" x={0} y={3} width={beltCm} height={4} />
      {spots.flatMap((spot) =>
        piecesOf(spot, beltCm).map(([from, to]) => (
          <rect
            key={`${spot.kind} ${from} ${to}`}
            class={spot.kind}
            x={spot.kind === 'point' ? Math.max(0, from - beltCm * 0.004) : from}
            y={spot.kind === 'point' ? 0 : 2}
            width={spot.kind === 'point' ? beltCm * 0.008 : to - from}
            height={spot.kind === 'point' ? 10 : 6}
          />
        )),
      )}
    </svg>
  );
}

function piecesOf({ fromCm, toCm }: BeltStretch, beltCm: number): [number, number][] {
  if (fromCm <= toCm) return [[fromCm, toCm]];
  return [
    [fromCm, beltCm],
    [0, toCm],
  ];
}

function Ruler({ beltCm }: { beltCm: number }) {
  const step = tickStep(beltCm, 7);
  const ticks = Array.from({ length: Math.floor(beltCm / step + 1e-6) + 1 }, (_, n) => n * step);
  return (
    <div class="ruler" aria-hidden="true">
      <div class="ticks">
        {ticks.map((cm) => (
          // Set through the object model, which the policy against inline style allows.
          <span
            key={cm}
            class={cm / beltCm > 0.93 ? 'at-end' : ''}
            style={{ left: `${(cm / beltCm) * 100}%` }}
          >
            {cm}
            {cm === 0 ? ' cm' : ''}
          </span>
        ))}
      </div>
    </div>
  );
}
