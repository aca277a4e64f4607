/**
 * Single keys that work from anywhere on the page, but while typing. They can be switched off (WCAG
 * 2.2, success criterion 2.1.4); Escape, which stops everything, cannot.
 */
interface KeyHandler {
  down(): void;
  up(): void;
}

const handlers = new Map<string, KeyHandler>();
let on = true;

/** How long Escape must be held: long enough not to close a list by accident and stop an animal. */
export const STOP_HOLD_MS = 350;
/** For whatever drives an output. */
export const LONG_PRESS_MS = 450;

export function setSingleKeys(value: boolean): void {
  on = value;
}

/** Binds a key until the returned function is called. */
export function bindKey(key: string, handler: KeyHandler): () => void {
  handlers.set(key, handler);
  return () => {
    if (handlers.get(key) === handler) handlers.delete(key);
  };
}

/** Of what is typed into the rules editor, the page sees only the editor's shadow host. */
function isTyping(event: Event): boolean {
  const [target] = event.composedPath();
  if (!(target instanceof HTMLElement)) return false;
  return target.isContentEditable || /^(INPUT|TEXTAREA|SELECT)$/.test(target.tagName);
}

/** Listens on the whole page; `stop` is called when Escape was held. */
export function listenForKeys(stop: () => void, holding: (is: boolean) => void): void {
  let escapeTimer: ReturnType<typeof setTimeout> | undefined;
  const letGo = () => {
    clearTimeout(escapeTimer);
    escapeTimer = undefined;
    holding(false);
  };
  window.addEventListener(
    'keydown',
    (event) => {
      if (event.key === 'Escape') {
        if (escapeTimer !== undefined || event.repeat) return;
        holding(true);
        escapeTimer = setTimeout(() => {
          letGo();
          stop();
        }, STOP_HOLD_MS);
        return;
      }
      const plain = !(event.ctrlKey || event.metaKey || event.altKey || event.repeat);
      const handler = handlers.get(event.key.toLowerCase());
      if (!on || !plain || !handler || isTyping(event)) return;
      event.preventDefault();
      handler.down();
    },
    true,
  );
  window.addEventListener(
    'keyup',
    (event) => {
      if (event.key === 'Escape') letGo();
      else handlers.get(event.key.toLowerCase())?.up();
    },
    true,
  );
  window.addEventListener('blur', () => {
    letGo();
    for (const handler of handlers.values()) handler.up();
  });
}
