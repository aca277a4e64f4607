import type { ComponentChildren } from 'preact';
import { useEffect, useRef, useState } from 'preact/hooks';
import { bindKey } from './keys.js';

export interface HoldButtonProps {
  /** How long it must be held; 0 acts at once. Whatever drives an output wants a long press. */
  readonly holdMs: number;
  readonly onFire: () => void;
  readonly children: ComponentChildren;
  /** A single key that does the same from anywhere on the page. */
  readonly shortcut?: string;
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
  const fire = useRef(props.onFire);
  fire.current = props.onFire;

  const cancel = () => {
    clearTimeout(timer.current);
    timer.current = undefined;
    setHolding(false);
  };
  const begin = () => {
    if (disabled || timer.current !== undefined) return;
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
      class={`hold ${props.class ?? ''} ${holding ? 'holding' : ''} ${holdMs > 0 ? 'long' : ''}`}
      aria-pressed={props.pressed}
      aria-label={props.label}
      aria-keyshortcuts={shortcut?.toUpperCase()}
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
      {shortcut === undefined ? null : (
        <span class="key" aria-hidden="true">
          {shortcut.toUpperCase()}
        </span>
      )}
    </button>
  );
}
