import type { Snapshot } from '../../server/loop/protocol.js';
import { shown, shownUnit } from './units.js';

/** One of the operator's choices as it is now. */
export type Chosen = Snapshot['choices'][number];

/** `45 to 52 cm from lap 31`, then whether the board has been armed by it. */
export function changeWords(
  chosen: Chosen | undefined,
  unit: string,
  armedLap: number | undefined,
): string {
  if (!chosen) return '';
  const { word } = shownUnit(unit);
  const now = `${shown(chosen.value, unit)}`;
  if (chosen.queued !== null) {
    const from = chosen.fromLap === null ? 'now' : `from lap ${chosen.fromLap}`;
    return `${now} to ${shown(chosen.queued, unit)} ${word} ${from}`.replace(/ +/g, ' ');
  }
  if (chosen.waits) return `${now} ${word} counts; the board has yet to be armed by it`;
  return armedLap === undefined ? '' : `The board confirmed ${now} ${word} in lap ${armedLap}`;
}
