/** What the Rehearse page knows, and what it makes of it. Nothing here touches the screen. */
import type { Snapshot } from '../../server/loop/protocol.js';
import type {
  BeltStretch,
  CheckAnswer,
  Outlined,
  RasterKind,
  RehearsalResult,
  RehearsalState,
  RigNames,
  RulesOutline,
  RulesProblem,
} from '../../server/web/rules/rulesMessages.js';
import { LAPS_KEPT, type LapStore, MARK, type Mark } from './laps.js';

export interface Notice {
  readonly kind: 'good' | 'bad';
  readonly text: string;
  readonly remedy: string;
}

/** How to rehearse: what the form holds. */
export interface RehearsalForm {
  seed: string;
  animalSeed: number;
  trained: boolean;
  minutes: number;
  /** More than one: how so many sessions differ. */
  runs: number;
}

export interface Rehearse {
  files: readonly string[];
  rig: RigNames | undefined;
  /** The file that is open; undefined for a text that was never saved. */
  path: string | undefined;
  version: string | undefined;
  savedText: string;
  text: string;
  /** The newest answer, and whether the text has changed since it was asked for. */
  check: CheckAnswer | undefined;
  checking: boolean;
  /** Offset of the cursor. */
  cursor: number;
  rehearsal: RehearsalState;
  /** The text that the newest rehearsal was of: after a change its result is an old one. */
  rehearsedText: string;
  form: RehearsalForm;
  /** The lap on top of the picture of the result; undefined for the last one. */
  topLap: number | undefined;
  notice: Notice | undefined;
}

export const NEW_TEXT = `title: A new session
belt: 180 cm
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
    limit: 1 per lap
end: time >= 30 min
`;

export function emptyRehearse(): Rehearse {
  return {
    files: [],
    rig: undefined,
    path: undefined,
    version: undefined,
    savedText: '',
    text: '',
    check: undefined,
    checking: false,
    cursor: 0,
    rehearsal: { state: 'none' },
    rehearsedText: '',
    form: { seed: '1', animalSeed: 1, trained: true, minutes: 30, runs: 1 },
    topLap: undefined,
    notice: undefined,
  };
}

export function isChanged({ text, savedText }: Rehearse): boolean {
  return text !== savedText;
}

/** As the service takes it: a name without an ending gets one. */
export function fileNameOf(typed: string): string {
  const name = typed.trim();
  return name === '' || /\.ya?ml$/i.test(name) ? name : `${name}.yaml`;
}

/** The place or rule that the cursor stands in. */
export function itemAt(outline: RulesOutline | null, offset: number): Outlined | undefined {
  if (!outline) return undefined;
  const all = [...outline.rules, ...outline.places];
  return all.find(({ from, to }) => offset >= from && offset <= to);
}

/** Where the cursor goes for a place or rule: after its name and colon, on its own line. */
export function cursorFor(item: Outlined): number {
  return item.from;
}

/** In words, for whoever cannot see the belt: `at 90 cm`, `from 170 to 10 cm, over the seam`. */
export function stretchWords({ kind, fromCm, toCm }: BeltStretch): string {
  const from = short(fromCm);
  const to = short(toCm);
  if (kind === 'point') return `at ${from} cm`;
  if (kind === 'somewhere') return `somewhere from ${from} to ${to} cm`;
  return `from ${from} to ${to} cm${fromCm > toCm ? ', over the seam' : ''}`;
}

export function spotsWords(spots: readonly BeltStretch[]): string {
  return spots.length === 0 ? 'at no place of its own' : spots.map(stretchWords).join(', or ');
}

function short(cm: number): string {
  return String(Math.round(cm * 10) / 10);
}

/** `2 errors, 1 warning`. */
export function countWords(problems: readonly RulesProblem[]): string {
  const errors = problems.filter(({ severity }) => severity === 'error').length;
  const warnings = problems.length - errors;
  const count = (n: number, word: string) => `${n} ${word}${n === 1 ? '' : 's'}`;
  if (problems.length === 0) return 'No problems';
  return [
    ...(errors ? [count(errors, 'error')] : []),
    ...(warnings ? [count(warnings, 'warning')] : []),
  ].join(', ');
}

/** The places of an outline as the raster shades them. */
export function placesOf(outline: RulesOutline | null | undefined): Snapshot['places'] {
  return (outline?.places ?? []).flatMap(({ name, spots }) =>
    spots.map(({ fromCm, toCm }) => ({ name, fromCm, toCm })),
  );
}

const MARK_OF: Readonly<Record<RasterKind, Mark>> = MARK;

/** Fills the store with the laps up to `topLap`, as if the session had come just so far. */
export function lapsInto(store: LapStore, result: RehearsalResult, topLap: number): void {
  store.clear();
  store.reach(topLap);
  for (const { lap, mm, kinds } of result.raster) {
    if (lap > topLap || lap <= topLap - LAPS_KEPT) continue;
    for (let n = 0; n < mm.length; n++) store.add(lap, mm[n]! / 10, MARK_OF[kinds[n]!]);
  }
}

/** The last lap that there is a row for. */
export function lastLap(result: RehearsalResult): number {
  return result.raster.at(-1)?.lap ?? 0;
}

/** `12.3 min`. */
export function minutesWords(seconds: number): string {
  return `${(seconds / 60).toFixed(1)} min`;
}
