import type { Program } from './program.js';
import type { State } from './state.js';

/** What a dashboard shows of the rules. */
export interface EngineView {
  readonly phase: string | null;
  readonly phaseLap: number;
  readonly cell: number;
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
  }[];
  readonly rules: readonly {
    readonly name: string;
    /** Real and sham together. */
    readonly firings: number;
    readonly shams: number;
    readonly withheld: number;
    readonly missed: number;
    readonly armed: boolean;
  }[];
}

export function viewOf(program: Program, s: State | undefined): EngineView {
  return {
    phase: (s && program.phases[s.phase]?.name) ?? null,
    phaseLap: s?.phaseLap() ?? 0,
    cell: s?.cellOrdinal ?? 0,
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
      };
    }),
  };
}

function placesOf(program: Program, s: State): EngineView['places'] {
  return program.places.flatMap(({ name, from, to }) => {
    const fromCm = from(s);
    const toCm = to(s);
    return !Number.isNaN(fromCm) && !Number.isNaN(toCm) ? [{ name, fromCm, toCm }] : [];
  });
}
