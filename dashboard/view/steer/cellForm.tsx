import { useEffect, useRef, useState } from 'preact/hooks';
import type { Actions } from '../actions.js';
import { HoldButton } from '../holdButton.js';
import { LONG_PRESS_MS } from '../keys.js';

/** Starting again for the next cell, with what the rig file asks to be noted of it. */
export function CellForm(props: { cell: number; fields: readonly string[]; actions: Actions }) {
  const { cell, fields, actions } = props;
  const [asking, setAsking] = useState(false);
  const form = useRef<HTMLFormElement>(null);
  useEffect(() => {
    if (asking) form.current?.querySelector('input')?.focus();
  }, [asking]);
  const begin = async () => {
    const said = form.current ? [...new FormData(form.current)] : [];
    const filled = said.map(([name, value]) => [name, String(value).trim()] as const);
    const answer = await actions.act({
      act: 'new cell',
      fields: Object.fromEntries(filled.filter(([, value]) => value !== '')),
    });
    if (answer.done) setAsking(false);
  };
  if (!asking) {
    return (
      <HoldButton
        holdMs={LONG_PRESS_MS}
        shortcut="next cell"
        onFire={() => {
          if (fields.length === 0) void begin();
          else setAsking(true);
        }}
      >
        {fields.length === 0 ? 'Next cell' : 'Next cell…'}{' '}
        <span class="under">cell {cell} now</span>
      </HoldButton>
    );
  }
  return (
    <form
      ref={form}
      class="cell-form"
      aria-labelledby="cell-title"
      onSubmit={(event) => {
        event.preventDefault();
        void begin();
      }}
    >
      <h3 id="cell-title">Cell {cell + 1}: phases and counts begin anew</h3>
      {fields.map((field) => (
        <label key={field}>
          {field}
          <input name={field} maxLength={200} autocomplete="off" />
        </label>
      ))}
      <div class="pair">
        <button type="submit" class="primary">
          Begin cell {cell + 1}
        </button>
        <button type="button" onClick={() => setAsking(false)}>
          Stay with cell {cell}
        </button>
      </div>
    </form>
  );
}
