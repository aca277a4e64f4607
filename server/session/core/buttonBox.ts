import type { Instant } from '../../rules/instant.js';
import type { OperatorAct } from '../inputs.js';
import type { RigButton } from '../rig/rig.js';

/** What a button must know of the session to say what it does now. */
export interface ButtonState {
  readonly lap: number;
  isHeld(what: 'stimulus' | 'water'): boolean;
}

/** One button between two frames. */
interface Key {
  readonly button: RigButton;
  readonly bit: number;
  down: boolean;
  /** Its contact is not looked at again before this: it may bounce. */
  quietUs: number;
  /** When a press that has to be long has been so; Infinity when none is under way. */
  longUs: number;
}

/** By how much the end is put off by one press. */
const PUT_OFF_LAPS = 5;

/**
 * Board inputs as buttons: acts follow from the frames themselves, so that a replay presses them at
 * the same instants. A bounce is ignored; what drives a stimulus or lets one go wants a long press.
 */
export class ButtonBox {
  readonly #keys: Key[];
  readonly #mask: number;
  /** Inputs that are low while pressed. */
  readonly #inverted: number;
  readonly #state: ButtonState;
  readonly #act: (act: OperatorAct, input: string) => void;
  #levels = 0;
  /** Some key waits for a bounce or a long press to be over. */
  #waiting = false;

  constructor(
    buttons: readonly RigButton[],
    state: ButtonState,
    act: (act: OperatorAct, input: string) => void,
  ) {
    this.#state = state;
    this.#act = act;
    this.#keys = buttons.map((button) => ({
      ...{ button, bit: 1 << button.line, down: false },
      ...{ quietUs: Number.NEGATIVE_INFINITY, longUs: Number.POSITIVE_INFINITY },
    }));
    this.#mask = this.#keys.reduce((mask, { bit }) => mask | bit, 0);
    this.#inverted = this.#keys.reduce(
      (m, { bit, button }) => (button.pressedHigh ? m : m | bit),
      0,
    );
  }

  /** What is held down as the session begins is no press. */
  begin(instant: Instant): void {
    this.#levels = (instant.inputs ^ this.#inverted) & this.#mask;
    for (const key of this.#keys) key.down = (this.#levels & key.bit) !== 0;
  }

  /** At each instant; one comparison while no button moves. */
  step(instant: Instant): void {
    const levels = (instant.inputs ^ this.#inverted) & this.#mask;
    if (levels === this.#levels && !this.#waiting) return;
    this.#levels = levels;
    this.#waiting = false;
    for (const key of this.#keys) {
      this.#look(key, (levels & key.bit) !== 0, instant.nowUs);
      if (instant.nowUs < key.quietUs || key.longUs < Number.POSITIVE_INFINITY)
        this.#waiting = true;
    }
  }

  #look(key: Key, down: boolean, nowUs: number): void {
    if (nowUs >= key.quietUs && down !== key.down) {
      key.down = down;
      key.quietUs = nowUs + key.button.debounceUs;
      if (!down) key.longUs = Number.POSITIVE_INFINITY;
      else if (wantsLong(key.button.does, this.#state)) key.longUs = nowUs + key.button.longUs;
      else this.#press(key);
    }
    if (nowUs < key.longUs) return;
    key.longUs = Number.POSITIVE_INFINITY;
    this.#press(key);
  }

  #press({ button }: Key): void {
    this.#act(actOf(button.does, this.#state), button.name);
  }
}

/** Holding and marking are harmless and act at once. */
function wantsLong(does: string, state: ButtonState): boolean {
  if (does === 'hold stimulus') return state.isHeld('stimulus');
  if (does === 'hold water') return state.isHeld('water');
  return /^(press|ask|next|previous|repeat) /.test(does);
}

/** The rig file's words for an act, which its schema has checked. */
function actOf(does: string, state: ButtonState): OperatorAct {
  const [verb, name = '', now] = does.split(' ');
  switch (verb) {
    case 'hold': {
      const what = name === 'water' ? 'water' : 'stimulus';
      return { act: 'hold', what, on: !state.isHeld(what) };
    }
    case 'press':
      return { act: 'press', button: name };
    case 'ask':
      return { act: 'ask', rule: name, laps: now === 'now' ? 0 : 1 };
    case 'next':
    case 'previous':
    case 'repeat':
      return name === 'cell' ? { act: 'new cell', fields: {} } : { act: 'phase', to: verb };
    case 'exclude':
      return { act: 'exclude lap', lap: state.lap };
    case 'put':
      return { act: 'put off', laps: PUT_OFF_LAPS, minutes: 0 };
    case 'acknowledge':
      return { act: 'acknowledge', alarm: 'all' };
    case 'stop':
      return { act: 'stop everything' };
    default:
      return { act: 'mark' };
  }
}
