import { needArm } from '../session/blinding/arms.js';
import { SessionCore } from '../session/core/sessionCore.js';
import type { StampedDecision } from '../session/decisions.js';
import { readDescription } from '../session/description.js';
import { loadSession } from '../session/loadSession.js';
import { readRecord } from '../session/record/readRecord.js';
import { waterOf } from '../session/store.js';
import type { SessionWater } from './entry.js';

/** A drop without a lick for so long after the valve opened was perhaps not drunk. */
export const DRUNK_WITHIN_US = 3_000_000;

/**
 * What a session gave, drop by drop: volumes by the board's own times, licks by the debounced sensor,
 * artefacts left out. What is not a drop of the session's own (flushing, priming and the drops of a
 * pre-flight happen outside a session's record) is not in it.
 */
export class DropCount {
  #givenNl = 0;
  #drops = 0;
  #notLickedNl = 0;
  #notLickedDrops = 0;
  #waiting: { readonly openedUs: number; readonly volumeNl: number }[] = [];
  #lickedUs = Number.NEGATIVE_INFINITY;

  take(decision: StampedDecision): void {
    this.#settle(decision.boardUs);
    if (decision.kind === 'pulse done' && decision.volumeNl > 0) {
      const { boardUs, onUs, volumeNl } = decision;
      const openedUs = boardUs - onUs;
      this.#givenNl += volumeNl;
      this.#drops++;
      // A drop is told when the valve closes, and may have been licked while it came.
      if (this.#lickedUs < openedUs) this.#waiting.push({ openedUs, volumeNl });
    } else if (decision.kind === 'lick' && !decision.artefact) {
      this.#lickedUs = decision.boardUs;
      this.#waiting = this.#waiting.filter(({ openedUs }) => openedUs > decision.boardUs);
    }
  }

  water(uncertainUl: number): SessionWater {
    this.#settle(Number.POSITIVE_INFINITY);
    return {
      ...{ givenUl: this.#givenNl / 1_000, uncertainUl, drops: this.#drops },
      ...{ notLickedUl: this.#notLickedNl / 1_000, notLickedDrops: this.#notLickedDrops },
    };
  }

  /** Drops that nobody licked in time. */
  #settle(nowUs: number): void {
    this.#waiting = this.#waiting.filter(({ openedUs, volumeNl }) => {
      if (nowUs - openedUs <= DRUNK_WITHIN_US) return true;
      this.#notLickedNl += volumeNl;
      this.#notLickedDrops++;
      return false;
    });
  }
}

/**
 * What the session in a folder gave, whole or torn, ended or not. Where it was never ended, what was
 * under way when its program died is uncertain; where the record cannot be read, the description's
 * own sums stand, and nothing is known of licks.
 * @throws LapwingError when neither can be read
 */
export async function sessionWaterOf(folder: string): Promise<SessionWater> {
  const { water } = readDescription(folder);
  try {
    return water === undefined ? await fromInputs(folder) : await fromDecisions(folder, water);
  } catch (error) {
    if (water === undefined) throw error;
    return { ...water, drops: 0, notLickedUl: 0, notLickedDrops: 0, licksUnknown: true };
  }
}

async function fromDecisions(
  folder: string,
  { givenUl, uncertainUl }: { readonly givenUl: number; readonly uncertainUl: number },
): Promise<SessionWater> {
  const count = new DropCount();
  const reader = await readRecord(folder);
  reader.visit({ decision: (decision) => count.take(decision) });
  const counted = count.water(uncertainUl);
  // A record with a hole tells fewer drops than the session counted when it ended.
  return { ...counted, givenUl: Math.max(givenUl, counted.givenUl) };
}

async function fromInputs(folder: string): Promise<SessionWater> {
  const count = new DropCount();
  const { setup, description } = loadSession(folder);
  needArm(description.blinding, setup.arm);
  const decision = (what: StampedDecision) => count.take(what);
  const core = new SessionCore(setup, { command: () => {}, decision });
  const reader = await readRecord(folder);
  reader.visit({
    sample: (_, sample) => core.sample(sample),
    input: (_, input) => core.take(input),
  });
  const reason = 'its program died';
  core.take({ kind: 'link down', reason });
  core.take({ kind: 'operator', act: { act: 'end', reason }, by: { who: 'Lapwing', from: '' } });
  return count.water(waterOf(core).uncertainUl);
}
