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
  const { from, to } = placed ? window(request, tracker) : { from: 0, to: 0 };
  return {
    id,
    output: order.output,
    flags: (order.delayUs > 0 ? PULSE_FLAG.startAt : 0) | (placed ? PULSE_FLAG.countWindow : 0),
    widthUs: order.widthUs,
    periodUs: order.periodUs,
    repeats: order.repeats,
    startUs: tracker.toBoardUs(request.causeUs + order.delayUs),
    expiryUs: tracker.toBoardUs(request.expiryUs + order.delayUs),
    countFrom: from,
    countTo: to,
  };
}

/** The counts between which a rise is near enough to its place. */
function window({ placeTravel, withinCounts }: FiringRequest, tracker: Tracker) {
  const behind = tracker.boardCountAt(placeTravel - withinCounts);
  const ahead = tracker.boardCountAt(placeTravel + withinCounts);
  // The window runs upwards in counts, and a reversed encoder counts down.
  return tracker.countRises(true) ? { from: behind, to: ahead } : { from: ahead, to: behind };
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
