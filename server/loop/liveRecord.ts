import { diskFree } from '../session/localDisk.js';
import type { Recorder } from '../session/record/recorder.js';
import type { TroubleKind } from '../session/record/segmentLog.js';
import type { RecordView } from './view.js';

/** Below this much free the disk is called low: an hour's session takes some tens of megabytes. */
const LOW_DISK_BYTES = 1 << 30;
const LOOK_MS = 5_000;

/** The record of the running session as the loop minds it: its tick, its troubles, the disk. */
export class LiveRecord {
  recorder: Recorder | undefined;
  readonly #folder: string;
  readonly #onTrouble: (kind: TroubleKind | 'low', error: Error) => void;
  #diskFree = Number.NaN;
  #lookedMs = Number.NEGATIVE_INFINITY;
  #toldLow = false;

  constructor(folder: string, onTrouble: (kind: TroubleKind | 'low', error: Error) => void) {
    this.#folder = folder;
    this.#onTrouble = onTrouble;
  }

  /** The loop's own 20 ms tick. */
  tick(nowMs: number): void {
    this.recorder?.tick();
    if (nowMs - this.#lookedMs < LOOK_MS) return;
    this.#lookedMs = nowMs;
    this.#diskFree = freeOrUnknown(this.#folder);
    if (!(this.#diskFree <= LOW_DISK_BYTES) || this.#toldLow) return;
    this.#toldLow = true;
    this.#onTrouble('low', new Error(`${Math.round(this.#diskFree / 1e6)} MB left on the disk`));
  }

  view(): RecordView {
    const { recorder } = this;
    const diskFreeGb = this.#diskFree / 1e9;
    if (recorder === undefined) return { state: 'off', bytes: 0, reason: '', diskFreeGb };
    const { bytes, reason } = recorder;
    return { state: recorder.state === 'failed' ? 'failed' : 'writing', bytes, reason, diskFreeGb };
  }
}

/** NaN where the folder is not there yet. */
function freeOrUnknown(folder: string): number {
  try {
    return diskFree(folder);
  } catch {
    return Number.NaN;
  }
}
