import { shortId } from '../../animals/animalsDesk.js';
import type { Trouble } from '../../animals/animalsFolder.js';
import type { Entry } from '../../animals/entry.js';
import type { AnimalRow, Overview } from '../../animals/overview.js';
import type { DayWater } from '../../animals/waterBook.js';
import type { WeighedOn } from '../../animals/weight.js';
import { columns } from '../columns.js';
import { CAUTION } from './options.js';

export function millilitres(ul: number): string {
  if (ul > 0 && ul < 100) return `${Number(ul.toFixed(1))} uL`;
  return `${(ul / 1_000).toFixed(2)} mL`;
}

/** "0.35 mL", "0.35 to 0.41 mL", "none", "?". */
export function dueWords({ due, open }: DayWater): string {
  if (due === null) return '–';
  if (due.mostUl === 0) return 'none';
  const least = (due.leastUl / 1_000).toFixed(2);
  const most = (due.mostUl / 1_000).toFixed(2);
  const words = least === most ? `${most} mL` : `${least} to ${most} mL`;
  return open.length > 0 ? `up to ${words}` : words;
}

export function hadWords(water: DayWater): string {
  const parts = [
    ...(water.sessions.length > 0 ? [`${millilitres(water.earnedUl)} earned`] : []),
    ...(water.uncertainUl > 0 ? [`${millilitres(water.uncertainUl)} uncertain`] : []),
    ...(water.notLickedUl > 0 ? [`${millilitres(water.notLickedUl)} perhaps not drunk`] : []),
    ...(water.byHandUl > 0 ? [`${millilitres(water.byHandUl)} by hand`] : []),
    ...(water.open.length > 0 ? ['a session not in the book yet'] : []),
  ];
  return parts.length === 0 ? 'nothing' : parts.join(', ');
}

export function weightWords(weighed: WeighedOn | null, least: number): string {
  if (weighed === null) return 'not weighed';
  const { grams, percent, level } = weighed;
  if (percent === null) return `${grams} g, no baseline`;
  const alarm = { fine: '', near: ', near its limit', below: `, BELOW ${least} %`, unknown: '' };
  return `${grams} g, ${percent.toFixed(1)} %${alarm[level]}`;
}

export function overviewWords({ animals, day, zone, troubles }: Overview): string {
  if (animals.length === 0) {
    return 'No animal is kept here yet: lapwing animals add NAME --baseline GRAMS --target VOLUME';
  }
  const kept = animals.filter(({ card }) => card.state !== 'left');
  const gone = animals.length - kept.length;
  const rows = kept.map(({ animal, card, today, water, lastSession }) => [
    animal,
    card.state,
    weightWords(today, card.leastPercent),
    hadWords(water),
    dueWords(water),
    lastSession?.at.slice(0, 16).replace('T', ' ') ?? '',
  ]);
  const head = ['animal', 'state', 'weight today', 'water today', 'due', 'last session'];
  const left = gone === 0 ? [] : [`${gone} not here any more: lapwing animals show NAME`];
  return [
    `${day}, ${zone}`,
    columns([head, ...rows]),
    ...left,
    ...troubleWords(troubles),
    CAUTION,
  ].join('\n');
}

export function eveningWords(
  rows: readonly AnimalRow[],
  { day, zone, troubles }: Overview,
): string {
  const list = rows.map(({ animal, water, evening, card }) => [
    animal,
    dueWords(water),
    evening,
    card.note,
  ]);
  return [
    `${day}, ${zone}`,
    list.length === 0
      ? 'Every animal on a water target has had its water today.'
      : columns([['animal', 'due', 'why', 'note'], ...list]),
    ...troubleWords(troubles),
    CAUTION,
  ].join('\n');
}

/** An entry in a line: what it says, who wrote it, and the letters by which it is corrected. */
export function entryWords(entry: Entry): string {
  const { id, written, by, computer } = entry;
  const when = 'at' in entry && entry.at !== undefined ? entry.at : written;
  return `${shortId(id)}  ${when.slice(0, 16).replace('T', ' ')}  ${factWords(entry)}  (${by || 'nobody named'}, ${computer})`;
}

function factWords(entry: Entry): string {
  switch (entry.kind) {
    case 'weight':
      return `weighed ${entry.grams} g${noteWords(entry.note)}`;
    case 'water':
      return `${millilitres(entry.ul)} by hand${noteWords(entry.note)}`;
    case 'session began':
      return `session ${entry.session} began on ${entry.rig}${entry.override ? ` despite: ${entry.override.against.join('; ')} (${entry.override.reason})` : ''}`;
    case 'session ended':
      return `session ${entry.session} gave ${millilitres(entry.water.givenUl)} in ${entry.water.drops} drops`;
    case 'card': {
      const set = Object.entries(entry.set).map(([field, value]) => `${field} ${value}`);
      const since = entry.from === undefined ? '' : ` from ${entry.from}`;
      return `${set.join(', ')}${since}${noteWords(entry.reason)}`;
    }
    case 'correction': {
      const to = entry.grams !== undefined ? `${entry.grams} g` : undefined;
      const amount = to ?? (entry.ul === undefined ? undefined : millilitres(entry.ul));
      const what = amount === undefined ? 'struck out' : `corrected to ${amount}`;
      return `${shortId(entry.of)} ${what}${noteWords(entry.reason)}`;
    }
  }
}

export function troubleWords(troubles: readonly Trouble[]): string[] {
  return troubles.map(({ animal, what }) => `Warning: ${animal}: ${what}.`);
}

function noteWords(note: string | undefined): string {
  return note ? ` (${note})` : '';
}
