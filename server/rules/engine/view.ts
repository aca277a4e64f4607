import { BASE_UNIT } from '../ast.js';
import type { Ending, Foreseen } from './ending.js';
import type { Program } from './program.js';
import type { RuleState } from './ruleState.js';
import type { State } from './state.js';

/** What a dashboard shows of the rules. */
export interface EngineView {
  readonly phase: string | null;
  readonly phaseLap: number;
  readonly cell: number;
  /** How far the phase has come, where that can be told: `3` of `10` `firings of induce this phase`. */
  readonly progress: null | {
    readonly done: number;
    readonly of: number;
    /** The base unit; empty for a plain number. */
    readonly unit: string;
    readonly what: string;
  };
  /** The session's end, as far as it can be foreseen. */
  readonly end: null | {
    /** Laps left, the present one counted in; null while no pace is known. */
    readonly laps: number | null;
    /** Seconds left, where a time ends it. */
    readonly s: number | null;
    /** Reckoned in laps alone, and not by the pace so far. */
    readonly exact: boolean;
    readonly what: string;
  };
  /** By how much the end was put off, in all. */
  readonly putOff: { readonly laps: number; readonly minutes: number };
  /** Places that are known now; `toCm` is `fromCm` for a point, and less when over the seam. */
  readonly places: readonly {
    readonly name: string;
    readonly fromCm: number;
    readonly toCm: number;
  }[];
  readonly choices: readonly {
    readonly name: string;
    readonly value: number | string;
    readonly queued: number | string | null;
    /** From which lap the queued value counts; null at once. */
    readonly fromLap: number | null;
  }[];
  readonly rules: readonly {
    readonly name: string;
    /** Real and sham together. */
    readonly firings: number;
    readonly shams: number;
    readonly withheld: number;
    readonly missed: number;
    readonly armed: boolean;
    /** Asked for by the operator and still to come: at once (`fromLap` 0), or in these laps. */
    readonly asked: null | { readonly fromLap: number; readonly toLap: number };
  }[];
}

export function viewOf(
  program: Program,
  s: State | undefined,
  ending: Ending | undefined,
): EngineView {
  return {
    phase: (s && program.phases[s.phase]?.name) ?? null,
    phaseLap: s?.phaseLap() ?? 0,
    cell: s?.cellOrdinal ?? 0,
    progress: s && ending ? progressOf(program, s, ending) : null,
    end: endOf(ending?.foreseen()),
    putOff: ending?.putOffSoFar ?? { laps: 0, minutes: 0 },
    places: s ? placesOf(program, s) : [],
    choices: program.choices.map((spec, n) => {
      const choice = s?.choices[n] ?? {
        ...spec.first,
        queued: false,
        queuedValue: 0,
        queuedOption: 0,
      };
      const shown = (value: number, option: number): number | string => {
        const word = spec.options[option]?.word ?? '';
        return word === '' ? value : word;
      };
      return {
        name: spec.name,
        value: shown(choice.value, choice.option),
        queued: choice.queued ? shown(choice.queuedValue, choice.queuedOption) : null,
        fromLap: choice.queued && spec.movesPlace ? (s?.lap ?? 0) + 1 : null,
      };
    }),
    rules: program.rules.map((spec, n) => {
      const real = s?.tallies[spec.realTally]?.total ?? 0;
      const shams = s?.tallies[spec.shamTally]?.total ?? 0;
      const r = s?.rules[n];
      return {
        name: spec.name,
        firings: real + shams,
        shams,
        withheld: r?.withheld ?? 0,
        missed: r?.missed ?? 0,
        armed: (r?.wantedSerial ?? 0) > 0,
        asked: askedOf(r, s?.lap ?? 0),
      };
    }),
  };
}

function askedOf(r: RuleState | undefined, lap: number): EngineView['rules'][number]['asked'] {
  if (r === undefined) return null;
  if (!Number.isNaN(r.askedUs)) return { fromLap: 0, toLap: 0 };
  return r.askedTo >= lap && r.askedTo > 0 ? { fromLap: r.askedFrom, toLap: r.askedTo } : null;
}

function progressOf(program: Program, s: State, { pace }: Ending): EngineView['progress'] {
  const ahead = program.phases[s.phase]?.ahead;
  const gap = ahead && program.gaps[pace.gapOf(ahead)];
  if (!gap) return null;
  const { what, dimension } = gap;
  return { done: gap.done(s), of: gap.goal(s), unit: BASE_UNIT[dimension], what };
}

function endOf(found: Foreseen | undefined): EngineView['end'] {
  if (found === undefined) return null;
  const { laps, us, exact, what } = found;
  const known = (value: number): number | null => (Number.isNaN(value) ? null : value);
  return { laps: known(laps), s: known(us / 1_000_000), exact, what };
}

function placesOf(program: Program, s: State): EngineView['places'] {
  return program.places.flatMap(({ name, from, to }) => {
    const fromCm = from(s);
    const toCm = to(s);
    return !Number.isNaN(fromCm) && !Number.isNaN(toCm) ? [{ name, fromCm, toCm }] : [];
  });
}
