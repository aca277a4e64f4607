import type { ComponentChildren } from 'preact';
import { useEffect, useRef, useState } from 'preact/hooks';
import type { KeyAct } from '../model/keymap.js';
import { bindKey, keysOf } from './keys.js';

export interface HoldButtonProps {
  /** How long it must be held; 0 acts at once. Whatever drives an output wants a long press. */
  readonly holdMs: number;
  readonly onFire: () => void;
  readonly children: ComponentChildren;
  /** The act whose keys do the same from anywhere on the page. */
  readonly shortcut?: KeyAct;
  readonly class?: string;
  readonly pressed?: boolean;
  readonly disabled?: boolean;
  readonly label?: string;
}

/**
 * A button that acts when it has been held long enough by pointer, Space, Enter or its own key. A
 * screen reader's click, which cannot be held, acts at once.
 */
export function HoldButton(props: HoldButtonProps) {
  const { holdMs, shortcut, disabled } = props;
  const [holding, setHolding] = useState(false);
  const timer = useRef<ReturnType<typeof setTimeout>>(undefined);
  const button = useRef<HTMLButtonElement>(null);
  const fire = useRef(props.onFire);
  fire.current = props.onFire;

  const cancel = () => {
    clearTimeout(timer.current);
    timer.current = undefined;
    setHolding(false);
  };
  const begin = () => {
    // A fieldset switches its buttons off, too.
    if (timer.current !== undefined || button.current?.matches(':disabled')) return;
    if (holdMs === 0) {
      fire.current();
      return;
    }
    setHolding(true);
    timer.current = setTimeout(() => {
      cancel();
      fire.current();
    }, holdMs);
  };
  const handlers = useRef({ begin, cancel });
  handlers.current = { begin, cancel };

  useEffect(() => cancel, []);
  useEffect(() => {
    if (shortcut === undefined) return undefined;
    return bindKey(shortcut, {
      down: () => handlers.current.begin(),
      up: () => handlers.current.cancel(),
    });
  }, [shortcut]);

  return (
    <button
      type="button"
      ref={button}
      class={`hold ${props.class ?? ''} ${holding ? 'holding' : ''} ${holdMs > 0 ? 'long' : ''}`}
      aria-pressed={props.pressed}
      aria-label={props.label}
      aria-keyshortcuts={shortcut && keysOf(shortcut)[0]}
      disabled={disabled}
      onPointerDown={(event) => {
        if (event.button === 0) begin();
      }}
      onPointerUp={cancel}
      onPointerLeave={cancel}
      onPointerCancel={cancel}
      onContextMenu={(event) => event.preventDefault()}
      onBlur={cancel}
      onKeyDown={(event) => {
        if (event.key !== 'Enter' && event.key !== ' ') return;
        event.preventDefault();
        if (!event.repeat) begin();
      }}
      onKeyUp={cancel}
      onClick={(event) => {
        // detail 0: neither mouse nor touch; keys were taken above.
        if (event.detail === 0 && !disabled) fire.current();
      }}
    >
      <span class="hold-text">{props.children}</span>
      {shortcut === undefined ? null : <KeyCaps act={shortcut} />}
    </button>
  );
}

/** The first key of an act, as it is written on the key. */
export function KeyCaps({ act }: { act: KeyAct }) {
  const [label] = keysOf(act);
  if (label === undefined) return null;
  return (
    <span class="key" aria-hidden="true">
      {label}
    </span>
  );
}
