import type { OutputOrder } from '../instant.js';
import type { ActionSpec, RuleSpec } from './program.js';
import type { State } from './state.js';
import { TRUE } from './truth.js';

export type OrderSpec = ActionSpec & { readonly kind: 'order' };

/** An action's part in a firing, every amount reckoned now. */
export function orderOf(s: State, action: OrderSpec): OutputOrder {
  const widthUs = Math.floor(action.widthUs(s) + 0.5);
  const periodUs = action.periodUs ? action.periodUs(s) : 0;
  const repeats = repeatsOf(s, action, widthUs, periodUs);
  return {
    output: action.output,
    volumeNl: action.volumeNl ? Math.floor(action.volumeNl(s) + 0.5) : 0,
    widthUs,
    periodUs: repeats > 1 ? periodUs : 0,
    repeats,
    stoppable: action.during !== undefined,
    delayUs: 0,
  };
}

/** As many pulses as were asked for, or as end within the longest time. */
function repeatsOf(s: State, action: OrderSpec, widthUs: number, periodUs: number): number {
  if (action.repeats) return Math.floor(action.repeats(s) + 0.5);
  if (!action.upToUs) return 1;
  const more = Math.floor((action.upToUs(s) - widthUs) / periodUs);
  return more > 0 ? more + 1 : 1;
}

/** The orders of a firing that start with it; those whose `while` is not true now do not start. */
export function ordersNow(s: State, spec: RuleSpec): OutputOrder[] {
  const orders: OutputOrder[] = [];
  for (const action of spec.actions) {
    if (action.kind !== 'order' || action.delayUs) continue;
    if (action.during && action.during(s) !== TRUE) continue;
    orders.push(orderOf(s, action));
  }
  return orders;
}

/** Whether orders made earlier are still what would be made now. Allocates nothing. */
export function stillSo(s: State, spec: RuleSpec, orders: readonly OutputOrder[]): boolean {
  let n = 0;
  for (const action of spec.actions) {
    if (action.kind !== 'order' || action.delayUs) continue;
    const order = orders[n++];
    if (order === undefined) return false;
    const widthUs = Math.floor(action.widthUs(s) + 0.5);
    if (order.widthUs !== widthUs) return false;
    if (action.volumeNl && order.volumeNl !== Math.floor(action.volumeNl(s) + 0.5)) return false;
    const periodUs = action.periodUs ? action.periodUs(s) : 0;
    const repeats = repeatsOf(s, action, widthUs, periodUs);
    if (order.repeats !== repeats || order.periodUs !== (repeats > 1 ? periodUs : 0)) return false;
  }
  return n === orders.length;
}

/** Why position is not known well enough for a rule to drive these outputs, if it is not. */
export function trustLacking(s: State, spec: RuleSpec): string | undefined {
  const { trust } = s.instant;
  if (!spec.tiedToPlace || trust === 'trusted') return undefined;
  for (const action of spec.actions) {
    if (action.kind !== 'order' || action.outputKind === 'mark') continue;
    if (action.outputKind === 'stimulus' || trust === 'unknown') return `position is ${trust}`;
  }
  return undefined;
}
