/** Alarms as sounds, if they are wished: what to play when, and what the browser keeps of the wish. */
import type { AlarmView } from '../../server/loop/alarms/alarms.js';

export interface SoundWish {
  readonly on: boolean;
  /** 0 to 1. */
  readonly volume: number;
  readonly levels: Readonly<Record<AlarmView['level'], boolean>>;
}

export const SILENT: SoundWish = {
  on: false,
  volume: 0.4,
  levels: { bad: true, warn: true, note: true },
};

/** A grave alarm that nobody has seen sounds again after so long. */
export const AGAIN_MS = 20_000;

export function readSounds(text: string | null): SoundWish {
  try {
    const kept = JSON.parse(text ?? '{}') as Partial<SoundWish>;
    const volume = Number(kept.volume);
    return {
      on: kept.on === true,
      volume: volume >= 0 && volume <= 1 ? volume : SILENT.volume,
      levels: {
        bad: kept.levels?.bad !== false,
        warn: kept.levels?.warn !== false,
        note: kept.levels?.note !== false,
      },
    };
  } catch {
    return SILENT;
  }
}

const GRAVE: Record<AlarmView['level'], number> = { note: 0, warn: 1, bad: 2 };

/** Which alarms have sounded, so that each sounds once, and a grave one again until it is seen. */
export class SoundWatch {
  private heard = new Map<string, number>();
  private begun = false;

  /**
   * The gravest level that should sound now, if any. What was on before the page was opened is not
   * news.
   * @param nowMs page time
   */
  next(
    alarms: readonly AlarmView[],
    wish: SoundWish,
    nowMs: number,
  ): AlarmView['level'] | undefined {
    const keyOf = ({ alarm, sinceUs }: AlarmView) => `${alarm} ${sinceUs}`;
    const now = new Map<string, number>();
    let level: AlarmView['level'] | undefined;
    for (const one of alarms) {
      const key = keyOf(one);
      const before = this.heard.get(key) ?? (this.begun ? undefined : nowMs);
      const again = one.level === 'bad' && before !== undefined && nowMs - before >= AGAIN_MS;
      const due = one.seenBy === null && (before === undefined || again);
      now.set(key, due ? nowMs : (before ?? nowMs));
      if (!due || !wish.on || !wish.levels[one.level]) continue;
      if (level === undefined || GRAVE[one.level] > GRAVE[level]) level = one.level;
    }
    this.heard = now;
    this.begun = true;
    return level;
  }
}
