import type { FiringRequest, OutputOrder } from '../../rules/instant.js';
import type { Tracker } from '../../track/tracker.js';
import { type Arm, PULSE_FLAG, type Pulse } from '../../wire/messages.js';

/** The wire message that starts one order of a firing from the host. */
export function pulseOf(
  id: number,
  order: OutputOrder,
  request: FiringRequest,
  tracker: Tracker,
): Pulse {
  const placed = !Number.isNaN(request.placeTravel) && order.delayUs === 0;
  const one = tracker.boardCountAt(request.placeTravel - request.withinCounts);
  const other = tracker.boardCountAt(request.placeTravel + request.withinCounts);
  const startUs = request.causeUs + order.delayUs;
  return {
    id,
    output: order.output,
    flags: (order.delayUs > 0 ? PULSE_FLAG.startAt : 0) | (placed ? PULSE_FLAG.countWindow : 0),
    widthUs: order.widthUs,
    periodUs: order.periodUs,
    repeats: order.repeats,
    startUs,
    expiryUs: request.expiryUs + order.delayUs,
    // On a reversed encoder the place behind has the greater count.
    countFrom: placed ? Math.min(one, other) : 0,
    countTo: placed ? Math.max(one, other) : 0,
  };
}

/** The wire message that lets the board start an order by itself at a count. */
export function armOf(
  id: number,
  slot: number,
  order: OutputOrder,
  rising: boolean,
  count: number,
): Arm {
  return {
    id,
    slot,
    output: order.output,
    rising: rising ? 1 : 0,
    count,
    widthUs: order.widthUs,
    periodUs: order.periodUs,
    repeats: order.repeats,
  };
}
