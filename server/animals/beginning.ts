import { type Day, dayOf } from './days.js';
import { cardOn, type History } from './history.js';
import { mostHadUl, waterOn } from './waterBook.js';
import { weighedOn } from './weight.js';

/** What the book says of an animal that is about to run; the session's description keeps it. */
export interface BeforeSession {
  readonly day: Day;
  readonly weightG: number | null;
  readonly percent: number | null;
  readonly leastPercent: number;
  readonly protocol: string;
  /** All that the animal may have had so far today, on any rig and by hand. */
  readonly hadTodayUl: number;
  readonly targetUl: number | null;
  /** What speaks against a session; it needs a reason to go on in spite of it. */
  readonly against: readonly string[];
}

/** What speaks against running an animal now, and what the session must know of it. */
export function beforeSession(history: History, now: Date, zone: string): BeforeSession {
  const day = dayOf(now, zone);
  const card = cardOn(history, day);
  const weighed = weighedOn(history, day);
  const water = waterOn(history, day);
  const against: string[] = [];
  if (card.state === 'left') against.push(`${history.name} is said to be kept here no longer`);
  if (weighed === undefined) against.push(`${history.name} has not been weighed today (${day})`);
  if (weighed?.level === 'below') {
    const percent = weighed.percent!.toFixed(1);
    against.push(
      `${history.name} is at ${percent} % of its baseline, below ${card.leastPercent} %: the protocol and the veterinarian decide`,
    );
  }
  for (const { session, rig } of water.open) {
    against.push(`what session ${session} on ${rig} gave is not in the water book yet`);
  }
  return {
    day,
    weightG: weighed?.grams ?? null,
    percent: weighed?.percent ?? null,
    leastPercent: card.leastPercent,
    protocol: card.protocol,
    hadTodayUl: mostHadUl(water),
    targetUl: water.targetUl,
    against,
  };
}
