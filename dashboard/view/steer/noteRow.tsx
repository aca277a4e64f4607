import { useEffect, useRef, useState } from 'preact/hooks';
import type { Snapshot } from '../../../server/loop/protocol.js';
import { fixed } from '../../model/format.js';
import type { Actions } from '../actions.js';
import { KeyCaps } from '../holdButton.js';
import { bindKey } from '../keys.js';

type Mark = Snapshot['marks'][number];

/**
 * Notes. The key makes a mark at once, where and when it was pressed, and the words may come later:
 * marks without words stay on the page, of whoever made them.
 */
export function NoteRow({ marks, actions }: { marks: readonly Mark[]; actions: Actions }) {
  const input = useRef<HTMLInputElement>(null);
  /** A mark's number, the newest one, or none: what is kept is then of the moment it is kept. */
  const [chosen, setChosen] = useState<number | 'newest' | undefined>();
  const mark = chosen === 'newest' ? marks.at(-1) : marks.find((one) => one.mark === chosen);

  const make = () => {
    if (input.current?.matches(':disabled')) return;
    void actions.act({ act: 'mark' });
    setChosen('newest');
    input.current?.focus();
  };
  const made = useRef(make);
  made.current = make;
  useEffect(() => bindKey('mark', { down: () => made.current(), up: () => undefined }), []);

  const keep = () => {
    const text = input.current!.value.trim();
    if (text === '') return;
    input.current!.value = '';
    setChosen(undefined);
    // The single keys work again.
    input.current!.blur();
    void actions.act({ act: 'note', text, ...(mark ? { mark: mark.mark } : {}) });
  };
  return (
    <form
      class="choice note"
      onSubmit={(event) => {
        event.preventDefault();
        keep();
      }}
    >
      <button type="button" class="mark" onClick={make}>
        Mark now
        <KeyCaps act="mark" />
      </button>
      <input
        id="note"
        ref={input}
        maxLength={2000}
        autocomplete="off"
        aria-label={mark ? `Words for mark ${mark.mark}` : 'Note'}
        placeholder={mark ? `words for mark ${mark.mark}` : 'a note'}
        onKeyDown={(event) => {
          if (event.key === 'Escape') event.currentTarget.blur();
        }}
      />
      <button type="submit">Keep</button>
      {marks.length > 0 ? (
        <ul class="marks" aria-label="Marks without words">
          {marks.map((one) => (
            <li key={one.mark}>
              <button
                type="button"
                aria-pressed={one === mark}
                onClick={() => {
                  setChosen(one.mark);
                  input.current?.focus();
                }}
              >
                Mark {one.mark}: lap {one.lap}
                {one.positionCm === null ? '' : `, ${fixed(one.positionCm, 0)} cm`}
              </button>
            </li>
          ))}
        </ul>
      ) : null}
    </form>
  );
}
