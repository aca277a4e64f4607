/**
 * Single keys that work from anywhere on the page, but while typing. They can be switched off (WCAG
 * 2.2, success criterion 2.1.4); Escape, which stops everything, cannot.
 */
import { actOf, DEFAULT_KEYMAP, type KeyAct, type Keymap, keyLabel } from '../model/keymap.js';

interface KeyHandler {
  down(): void;
  up(): void;
}

const handlers = new Map<KeyAct, KeyHandler>();
/** Keys that are down, and whose handler heard of it: a map changed meanwhile loses none. */
const down = new Map<string, KeyHandler>();
let on = true;
let keymap: Keymap = DEFAULT_KEYMAP;
let wanted: ((code: string | undefined) => void) | undefined;

/** How long Escape must be held: long enough not to close a list by accident and stop an animal. */
export const STOP_HOLD_MS = 350;
/** For whatever drives an output. */
export const LONG_PRESS_MS = 450;

export function setSingleKeys(value: boolean): void {
  on = value;
}

export function setKeymap(map: Keymap): void {
  keymap = map;
}

/** The keys of an act as they are written on keys; empty for one without. */
export function keysOf(act: KeyAct): readonly string[] {
  return (keymap[act] ?? []).map(keyLabel);
}

/** Binds an act's keys until the returned function is called. */
export function bindKey(act: KeyAct, handler: KeyHandler): () => void {
  handlers.set(act, handler);
  return () => {
    if (handlers.get(act) === handler) handlers.delete(act);
  };
}

/** Takes the next key that is pressed, whatever it does else; Escape takes none. */
export function takeNextKey(take: (code: string | undefined) => void): () => void {
  wanted = take;
  return () => {
    if (wanted === take) wanted = undefined;
  };
}

const TEXT_INPUTS = /^(text|search|number|password|email|url|tel|date|time|datetime-local)$/;

/** Of what is typed into the rules editor, the page sees only the editor's shadow host. */
function isTyping(event: Event): boolean {
  const [target] = event.composedPath();
  if (!(target instanceof HTMLElement)) return false;
  if (target instanceof HTMLInputElement) return TEXT_INPUTS.test(target.type);
  return target.isContentEditable || /^(TEXTAREA|SELECT)$/.test(target.tagName);
}

/** Listens on the whole page; `stop` is called when Escape was held. */
export function listenForKeys(stop: () => void, holding: (is: boolean) => void): void {
  let stopTimer: ReturnType<typeof setTimeout> | undefined;
  const letGo = () => {
    clearTimeout(stopTimer);
    stopTimer = undefined;
    holding(false);
  };
  const hold = () => {
    if (stopTimer !== undefined) return;
    holding(true);
    stopTimer = setTimeout(() => {
      letGo();
      stop();
    }, STOP_HOLD_MS);
  };
  handlers.set('stop', { down: hold, up: letGo });
  window.addEventListener(
    'keydown',
    (event) => {
      if (wanted !== undefined && !event.repeat) {
        event.preventDefault();
        event.stopPropagation();
        const take = wanted;
        wanted = undefined;
        take(event.code === 'Escape' ? undefined : event.code);
        return;
      }
      if (event.key === 'Escape') {
        if (!event.repeat) hold();
        return;
      }
      const plain = !(event.ctrlKey || event.metaKey || event.altKey || event.repeat);
      const act = actOf(keymap, event.code);
      const handler = act && handlers.get(act);
      if (!on || !plain || !handler || isTyping(event)) return;
      event.preventDefault();
      down.set(event.code, handler);
      handler.down();
    },
    true,
  );
  window.addEventListener(
    'keyup',
    (event) => {
      if (event.key === 'Escape') letGo();
      down.get(event.code)?.up();
      down.delete(event.code);
    },
    true,
  );
  window.addEventListener('blur', () => {
    letGo();
    for (const handler of down.values()) handler.up();
    down.clear();
  });
}
