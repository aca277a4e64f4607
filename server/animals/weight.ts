import type { Day } from './days.js';
import type { AnimalCard } from './entry.js';
import { cardOn, type History, type Weighing } from './history.js';

/** `near`: within 5 points of the alarm level; `unknown`: no baseline to compare with. */
export type WeightLevel = 'fine' | 'near' | 'below' | 'unknown';

const NEAR_POINTS = 5;

export interface WeighedOn {
  readonly day: Day;
  readonly at: string;
  readonly grams: number;
  readonly percent: number | null;
  readonly level: WeightLevel;
}

/** Weight without the implant as percent of the baseline without it; null without a baseline. */
export function percentOf(card: AnimalCard, grams: number): number | null {
  if (card.baselineG === null) return null;
  const baselineG = card.baselineG - (card.implantInBaseline ? card.implantG : 0);
  return baselineG > 0 ? (100 * (grams - card.implantG)) / baselineG : null;
}

export function levelOf(card: AnimalCard, percent: number | null): WeightLevel {
  if (percent === null) return 'unknown';
  if (percent < card.leastPercent) return 'below';
  return percent < card.leastPercent + NEAR_POINTS ? 'near' : 'fine';
}

/** The last weighing of a day, by the card as it was that day. */
export function weighedOn(history: History, day: Day): WeighedOn | undefined {
  const last = history.weighings.findLast((one) => one.day === day && !one.struck);
  return last && read(history, last);
}

export function lastWeighing(history: History): WeighedOn | undefined {
  const last = history.weighings.findLast((one) => !one.struck);
  return last && read(history, last);
}

export function weightsOf(history: History): WeighedOn[] {
  return history.weighings.filter(({ struck }) => !struck).map((one) => read(history, one));
}

/**
 * Why a weight is probably mistyped: half the last one, or less, or half as much again. Undefined
 * where it is likely, or where there is nothing to compare with.
 */
export function whyUnlikely(history: History, grams: number, day: Day): string | undefined {
  const last = lastWeighing(history);
  const beforeG = last?.grams ?? cardOn(history, day).baselineG;
  if (beforeG === null || (grams > 0.5 * beforeG && grams < 1.5 * beforeG)) return undefined;
  return `${history.name} weighed ${beforeG} g ${last === undefined ? 'at its baseline' : `on ${last.day}`}, and now ${grams} g`;
}

function read(history: History, { day, at, grams }: Weighing): WeighedOn {
  const card = cardOn(history, day);
  const percent = percentOf(card, grams);
  return { day, at, grams, percent, level: levelOf(card, percent) };
}
