import type { Trust } from '../rules/instant.js';

/** What the tracker found out, told after the instant that showed it has been filled. */
export type TrackEvent =
  | {
      readonly kind: 'seam';
      readonly event: 'first' | 'accepted' | 'ignored' | 'missed' | 'rehomed';
      /** Where the mark was met, less where it was expected; null where there was no measure. */
      readonly slipMm: number | null;
    }
  | { readonly kind: 'trust'; readonly trust: Trust; readonly reason: string }
  | { readonly kind: 'lap began'; readonly lap: number }
  /** `stampUs` is the edge's own extended board time, which may lie just before the instant. */
  | { readonly kind: 'lick'; readonly artefact: boolean; readonly stampUs: number }
  | { readonly kind: 'lick sensor'; readonly state: 'stuck' | 'released' | 'too fast' }
  /** The belt moved while no frame came: places passed meanwhile are missed. */
  | { readonly kind: 'unseen'; readonly movedCm: number; readonly forUs: number };

/** Told each event of a frame in order, before `sample` or `edge` returns. */
export interface TrackListener {
  tracked(event: TrackEvent): void;
}
