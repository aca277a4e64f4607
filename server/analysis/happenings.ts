import type { SessionData } from './readSession.js';
import { slipSpans } from './slips.js';

/** One lap: from its 0 cm to the next lap's, or to the session's end. */
export interface Lap {
  /** Number of the engine input with which it began. */
  readonly input: number;
  /** 0 is the stretch before the first lap, in which position is not known. */
  readonly lap: number;
  readonly startUs: number;
  readonly stopUs: number;
  /** The whole belt was run: false for lap 0 and for the one that the end cut short. */
  readonly complete: boolean;
  /** The operator said to leave it out. */
  readonly excluded: boolean;
  readonly cell: number;
  readonly phase: string | null;
  /** Met at the mark that ended the lap: the encoder's place less the mark's; null without one. */
  readonly slipMm: number | null;
}
export interface Lick {
  readonly input: number;
  readonly boardUs: number;
  readonly lap: number;
  readonly positionCm: number | null;
  readonly speedCmPerS: number;
  /** Within some ms of an output's change: may be electrical. */
  readonly artefact: boolean;
}
export interface Drop {
  readonly input: number;
  /** When the valve opened. */
  readonly boardUs: number;
  readonly openUs: number;
  readonly volumeUl: number;
  readonly output: string;
  readonly rule: string | null;
  readonly lap: number;
  /** Where the belt was when the valve opened; null where unknown. */
  readonly positionCm: number | null;
}
export interface PhaseSpan {
  readonly input: number;
  readonly phase: string;
  readonly index: number;
  readonly startUs: number;
  readonly stopUs: number;
  readonly lap: number;
  readonly reason: string;
}

/** Laps in order, lap 0 included where the session began before the first mark. */
export function lapsOf({ decisions, beganUs, endedUs, rig }: SessionData): Lap[] {
  type Open = { -readonly [K in keyof Lap]: Lap[K] };
  const laps: Open[] = [];
  const excluded = new Set<number>();
  let cell = 1;
  let phase: string | null = null;
  const begin = (input: number, lap: number, startUs: number) =>
    laps.push({
      ...{ input, lap, startUs, stopUs: endedUs, complete: false },
      ...{ excluded: false, cell, phase, slipMm: null },
    });
  begin(decisions.find(({ kind }) => kind === 'session began')!.input, 0, beganUs);
  for (const decision of decisions) {
    if (decision.boardUs < beganUs) continue;
    const open = laps.at(-1)!;
    switch (decision.kind) {
      case 'lap began':
        open.stopUs = decision.boardUs;
        open.complete = open.lap > 0;
        begin(decision.input, decision.lap, decision.boardUs);
        break;
      case 'phase began':
        phase = decision.phase;
        if (decision.boardUs === open.startUs) open.phase = phase;
        break;
      case 'cell began':
        cell = decision.index;
        break;
      case 'operator':
        if (decision.act.act === 'exclude lap') excluded.add(decision.act.lap);
        break;
    }
  }
  const spans = slipSpans(decisions, rig.belt.lengthCm);
  const slips = new Map(spans.map(({ lap, slipMm }) => [lap, slipMm]));
  for (const lap of laps) {
    lap.excluded = excluded.has(lap.lap);
    lap.slipMm = slips.get(lap.lap) ?? null;
  }
  // Where position was known at once, lap 0 has no length.
  return laps.filter(({ lap, startUs, stopUs }) => lap > 0 || stopUs > startUs);
}

export function licksOf({ decisions }: SessionData): Lick[] {
  return decisions.flatMap((d) =>
    d.kind === 'lick'
      ? [
          {
            ...{ input: d.input, boardUs: d.boardUs, lap: d.lap, positionCm: d.positionCm },
            ...{ speedCmPerS: d.speedCmPerS, artefact: d.artefact },
          },
        ]
      : [],
  );
}

/** Drops by the board's word: when the valve opened, for how long, and the calibrated volume. */
export function dropsOf(session: SessionData): Drop[] {
  const { decisions, samples } = session;
  return decisions.flatMap((d) => {
    if (d.kind !== 'pulse done' || d.volumeNl === 0) return [];
    const boardUs = d.boardUs - d.onUs;
    const fired = decisions.findLast(
      (f) => f.kind === 'fired' && f.input <= d.input && f.output === d.output && f.rule === d.rule,
    );
    const riseUs = fired?.kind === 'fired' ? fired.riseUs : null;
    const riseCm = fired?.kind === 'fired' ? fired.riseCm : null;
    const at = samples.indexAt(riseUs ?? boardUs);
    const placed = at < samples.length ? samples.positionCm[at]! : Number.NaN;
    return [
      {
        ...{ input: d.input, boardUs: riseUs ?? boardUs, openUs: d.onUs },
        ...{ volumeUl: d.volumeNl / 1_000, output: d.output, rule: d.rule, lap: d.lap },
        positionCm: riseCm ?? (Number.isNaN(placed) ? null : placed),
      },
    ];
  });
}

export function phasesOf({ decisions, endedUs }: SessionData): PhaseSpan[] {
  const began = decisions.flatMap((d) => (d.kind === 'phase began' ? [d] : []));
  return began.map(({ input, phase, index, boardUs, lap, reason }, i) => ({
    ...{ input, phase, index, lap, reason, startUs: boardUs },
    stopUs: began[i + 1]?.boardUs ?? endedUs,
  }));
}
