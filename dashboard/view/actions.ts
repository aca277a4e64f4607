import type { AlarmView } from '../../server/loop/alarms/alarms.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import type { Keymap } from '../model/keymap.js';
import type { SoundWish } from '../model/sounds.js';
import type { Answer, Beginning } from '../stream/api.js';

export type Theme = 'dark' | 'red' | 'light';

/** What the page can do; everything that a view calls. */
export interface Actions {
  stopEverything(): void;
  dismissStop(): void;
  begin(session: Beginning): Promise<Answer>;
  end(reason: string): Promise<Answer>;
  act(act: OperatorAct): Promise<Answer>;
  /** From nobody, or from whoever had them at the change that is on the screen. */
  takeControls(seen: number): Promise<Answer>;
  giveUpControls(): Promise<Answer>;
  signOut(): Promise<void>;
  setTheme(theme: Theme): void;
  setKeys(on: boolean): void;
  setLamp(lamp: number): void;
  setSounds(wish: SoundWish): void;
  trySound(level: AlarmView['level']): void;
  setKeymap(map: Keymap): void;
  dismissNotice(): void;
}
