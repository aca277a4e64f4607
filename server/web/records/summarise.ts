import { maskOf } from '../../analysis/hideArm.js';
import { LapwingError } from '../../errors/codes.js';
import { derivedFolder } from '../../export/exportFolder.js';
import { packageVersion } from '../../packageRoot.js';
import type { Mask } from '../../session/blinding/mask.js';
import type { StampedDecision } from '../../session/decisions.js';
import { loadSession } from '../../session/loadSession.js';
import { readRecord } from '../../session/record/readRecord.js';
import { type RuleSummary, Summariser } from '../../session/summary.js';
import { writeFileWhole } from '../../session/writeFileWhole.js';
import { type KeptSummary, summaryPath, summaryStamp } from './made.js';
import type { ErrorsTold, FiringTold, RuleTold, SummaryTold } from './recordsMessages.js';

/** So many are told and kept; the report's proof sheet has all of them. */
const MOST_FIRINGS = 2_000;
const MOST_NOTES = 200;

/**
 * What happened in a session, from the decisions in its record, and keeps it beside the record: the
 * next who asks need not read the record. Where it cannot be kept it is told all the same.
 * @throws LapwingError RECORD_NO_SESSION, and as `readRecord` does
 */
export async function summarise(
  folder: string,
  progress: (done: number) => void,
): Promise<SummaryTold> {
  const stamp = await summaryStamp(folder, packageVersion);
  const { names, inputs, mask } = plannedIn(folder);
  const gathered = new Gathered(names);
  const reader = await readRecord(folder);
  reader.visit({
    decision: (decision) => {
      const shown = mask ? mask.shown(decision) : decision;
      if (shown !== undefined) gathered.take(shown);
      if (inputs > 0) progress(Math.min(1, decision.input / inputs));
    },
  });
  if (!gathered.began) {
    throw new LapwingError('recordNoSession', `${folder}: no session begins in its record.`);
  }
  const { summary } = gathered;
  try {
    derivedFolder(folder);
    const kept: KeptSummary = { of: stamp, summary };
    writeFileWhole(summaryPath(folder), JSON.stringify(kept));
  } catch {
    // A folder that may only be read: it is made again when it is asked for again.
  }
  return summary;
}

/** The rules in the order of their file, and how many inputs there are, where that can be read. */
function plannedIn(folder: string): {
  names: readonly string[];
  inputs: number;
  mask?: Mask | undefined;
} {
  try {
    const loaded = loadSession(folder);
    const { rules, description } = loaded;
    const names = rules.file.rules.map(({ name }) => name.name);
    return { names, inputs: description.record?.lastInput ?? 0, mask: maskOf(loaded) };
  } catch {
    return { names: [], inputs: 0 };
  }
}

class Gathered {
  began = false;
  readonly #summariser: Summariser;
  readonly #firings: FiringTold[] = [];
  readonly #notes: { timeS: number; text: string }[] = [];
  #leftOut = 0;
  #beganUs = 0;
  #lastUs = 0;

  constructor(rules: readonly string[]) {
    this.#summariser = new Summariser(rules);
  }

  take(decision: StampedDecision): void {
    this.#summariser.take(decision);
    this.#lastUs = decision.boardUs;
    if (decision.kind === 'session began') {
      this.began = true;
      this.#beganUs = decision.boardUs;
    } else if (decision.kind === 'fired') {
      this.#fired(decision);
    } else if (decision.kind === 'note' && this.#notes.length < MOST_NOTES) {
      this.#notes.push({ timeS: this.#seconds(decision.boardUs), text: decision.text });
    }
  }

  get summary(): SummaryTold {
    const { rules, laps, licks, waterNl } = this.#summariser.summary;
    return {
      // Of a session that was never ended, up to the last thing recorded.
      minutes: this.#seconds(this.#lastUs) / 60,
      ...{ laps, licks, waterUl: waterNl / 1_000 },
      rules: [...rules].map(([name, rule]) => ruleTold(name, rule)),
      firings: this.#firings,
      firingsLeftOut: this.#leftOut,
      notes: this.#notes,
    };
  }

  #fired(decision: Extract<StampedDecision, { kind: 'fired' }>): void {
    if (this.#firings.length >= MOST_FIRINGS) {
      this.#leftOut++;
      return;
    }
    const { rule, output, lap, sham, armed, placeCm, errorMm } = decision;
    const timeS = this.#seconds(decision.riseUs ?? decision.boardUs);
    const atCm = decision.riseCm ?? decision.positionCm;
    this.#firings.push({ timeS, lap, rule, output, atCm, placeCm, errorMm, sham, armed });
  }

  #seconds(boardUs: number): number {
    return (boardUs - this.#beganUs) / 1e6;
  }
}

function ruleTold(name: string, rule: RuleSummary): RuleTold {
  return {
    ...{ name, fired: rule.fired, shams: rule.shams },
    not: [...rule.not].map(([why, times]) => ({ why, times })),
    armed: errorsTold(rule.armedErrorsMm),
    host: errorsTold(rule.hostErrorsMm),
  };
}

function errorsTold(errorsMm: readonly number[]): ErrorsTold | null {
  if (errorsMm.length === 0) return null;
  const sorted = errorsMm.map(Math.abs).sort((a, b) => a - b);
  const medianMm = sorted[Math.floor(sorted.length / 2)]!;
  return { firings: sorted.length, medianMm, worstMm: sorted.at(-1)! };
}
