import { type Keymap, readKeymap } from '../model/keymap.js';
import { readSounds, type SoundWish } from '../model/sounds.js';

/** The screen is never dimmer than this share: it has to be found again. */
export const LEAST_LAMP = 0.15;

/** What this browser keeps for whoever sits before it. */
export interface BrowserSettings {
  /** Brightness of the page, `LEAST_LAMP` to 1. */
  readonly lamp: number;
  readonly sounds: SoundWish;
  /** The browser does not let the page sound before a key or a click. */
  readonly soundBlocked: boolean;
  readonly keymap: Keymap;
}

export function recallSettings(recall: (name: string) => string | null): BrowserSettings {
  return {
    lamp: readLamp(recall('lapwing.lamp')),
    sounds: readSounds(recall('lapwing.sounds')),
    soundBlocked: false,
    keymap: readKeymap(recall('lapwing.keymap')),
  };
}

export function readLamp(text: string | null): number {
  const lamp = Number(text ?? 1);
  return lamp >= LEAST_LAMP && lamp <= 1 ? lamp : 1;
}

/** Dims the whole page, canvases too. */
export function setLamp(lamp: number): void {
  document.documentElement.style.setProperty('--lamp', String(lamp));
}
