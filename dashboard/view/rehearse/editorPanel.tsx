import { useEffect, useRef } from 'preact/hooks';
import { RulesEditor } from '../../editor/editor.js';
import { isChanged, type Rehearse } from '../../model/rehearse.js';
import type { Desk } from './desk.js';

/** The file's name, its text, and what became of saving it. */
export function EditorPanel({ desk, state }: { desk: Desk; state: Rehearse }) {
  const changed = isChanged(state);
  const leave = () =>
    !changed || window.confirm('The text has changes that are not saved. Leave it?');
  return (
    <section class="panel editor-panel" aria-labelledby="editor-title">
      <div class="editor-head">
        <h2 id="editor-title">Rules file</h2>
        <label>
          <span class="unseen">Open a file</span>
          <select
            value={state.path ?? ''}
            onChange={(event) => {
              const select = event.currentTarget;
              const wanted = select.value;
              // What is chosen is what is open: the list goes back if the text stays.
              if (!leave()) select.value = state.path ?? '';
              else if (wanted === '') desk.startNew();
              else void desk.open(wanted);
            }}
          >
            <option value="">new file</option>
            {state.files.map((file) => (
              <option key={file} value={file}>
                {file}
              </option>
            ))}
          </select>
        </label>
        {state.path === undefined ? null : (
          <button type="button" disabled={!changed} onClick={() => void desk.save()}>
            Save
          </button>
        )}
        {changed ? <span class="tag unsaved">not saved</span> : null}
        <form
          class="save-as"
          onSubmit={(event) => {
            event.preventDefault();
            const field = event.currentTarget.elements.namedItem('name') as HTMLInputElement;
            void desk.save(field.value).then(() => {
              if (desk.state.notice?.kind === 'good') field.value = '';
            });
          }}
        >
          <input
            name="name"
            aria-label="Save under a new name"
            placeholder="new name"
            maxLength={200}
          />
          <button type="submit">Save as</button>
        </form>
      </div>
      {state.notice ? (
        <div class={`desk-notice ${state.notice.kind}`} role="status">
          <p>
            {state.notice.text} <span>{state.notice.remedy}</span>
          </p>
          <button type="button" onClick={() => desk.dismiss()}>
            Understood
          </button>
        </div>
      ) : null}
      <EditorBox key={desk.opened} desk={desk} />
      <p class="hint">
        <span class="key">Ctrl Space</span> completes, <span class="key">F8</span> goes to the next
        problem, <span class="key">Ctrl Enter</span> rehearses, <span class="key">Ctrl S</span>{' '}
        saves, <span class="key">Tab</span> leaves the text.
      </p>
    </section>
  );
}

function EditorBox({ desk }: { desk: Desk }) {
  const box = useRef<HTMLDivElement>(null);
  useEffect(() => {
    const { state } = desk;
    const editor = new RulesEditor(box.current!, state.text, state.cursor, {
      changed: (text) => desk.changed(text),
      cursor: (offset) => desk.cursor(offset),
      save: () => void desk.save(),
      rehearse: () => void desk.rehearse(),
      rig: () => state.rig,
    });
    const checked = () => editor.show(desk.state.check?.problems ?? []);
    desk.onChecked = checked;
    desk.onGoTo = (offset) => editor.goTo(offset);
    desk.onFocus = () => editor.focus();
    desk.onChecked();
    return () => {
      editor.release();
      // The next editor may be there already, and it is the one to be told.
      if (desk.onChecked !== checked) return;
      desk.onChecked = desk.onFocus = () => {};
      desk.onGoTo = () => {};
    };
  }, [desk]);
  return <div class="editor-box" ref={box} />;
}
