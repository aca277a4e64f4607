import { needArm } from '../session/blinding/arms.js';
import type { StampedDecision } from '../session/decisions.js';
import { readDescription, type SessionDescription } from '../session/description.js';
import { loadSession } from '../session/loadSession.js';
import { readRecord } from '../session/record/readRecord.js';
import { replaySession } from '../session/replay.js';
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
 * @param progress told the share of the record that has been read
 * @throws LapwingError when neither can be read
 */
export async function sessionWaterOf(
  folder: string,
  progress: (done: number) => void = () => {},
): Promise<SessionWater> {
  const { water, record } = readDescription(folder);
  const most = record?.lastInput ?? Number.POSITIVE_INFINITY;
  try {
    const given = water ?? (await replayed(folder, (inputs) => progress(inputs / most / 2)));
    return await counted(folder, given, (input) => progress(Math.min(1, input / most)));
  } catch (error) {
    if (water === undefined) throw error;
    return { ...water, drops: 0, notLickedUl: 0, notLickedDrops: 0, licksUnknown: true };
  }
}

type Given = NonNullable<SessionDescription['water']>;

async function counted(
  folder: string,
  { givenUl, uncertainUl }: Given,
  progress: (input: number) => void,
): Promise<SessionWater> {
  const count = new DropCount();
  const reader = await readRecord(folder);
  reader.visit({
    decision: (decision) => {
      count.take(decision);
      progress(decision.input);
    },
  });
  const water = count.water(uncertainUl);
  // A record with a hole tells fewer drops than the session counted when it ended.
  return { ...water, givenUl: Math.max(givenUl, water.givenUl) };
}

/** Of a session whose program died before it could say. */
async function replayed(folder: string, progress: (inputs: number) => void): Promise<Given> {
  const { setup, description } = loadSession(folder);
  needArm(description.blinding, setup.arm);
  return (await replaySession(folder, setup, progress)).water;
}
