import { useEffect, useRef, useState } from 'preact/hooks';
import type { Setup, Snapshot } from '../../server/loop/protocol.js';
import { boundsProblem } from '../model/bounds.js';
import { unitWords } from '../model/format.js';
import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { HandButton } from './handOnBelt.js';
import { HoldButton } from './holdButton.js';
import { bindKey, LONG_PRESS_MS } from './keys.js';

type Choice = NonNullable<Setup['session']>['choices'][number];
type Chosen = Snapshot['choices'][number];

/** What an operator may change while the animal runs. */
export function SteerPanel({ live, actions }: { live: Live; actions: Actions }) {
  const session = live.setup?.session;
  const { state } = live;
  if (!session || state?.session !== 'running') return null;
  return (
    <section class="panel steer-panel" aria-labelledby="steer-title">
      <h2 id="steer-title">Steer</h2>
      <div class="pair">
        <Hold what="stimulus" shortcut="s" reason={state.held.stimulus} actions={actions} />
        <Hold what="water" shortcut="w" reason={state.held.water} actions={actions} />
      </div>
      <HandButton live={live} actions={actions} />
      {session.buttons.length > 0 ? (
        <div class="buttons">
          {session.buttons.map((button, n) => (
            <HoldButton
              key={button}
              holdMs={LONG_PRESS_MS}
              {...(n < 9 ? { shortcut: String(n + 1) } : {})}
              onFire={() => void actions.act({ act: 'press', button })}
            >
              {button.replaceAll('_', ' ')}
            </HoldButton>
          ))}
        </div>
      ) : null}
      {session.choices.map((choice) => (
        <ChoiceRow
          key={choice.name}
          choice={choice}
          chosen={state.choices.find((one) => one.name === choice.name)}
          actions={actions}
        />
      ))}
      <Note actions={actions} />
      <div class="pair">
        <HoldButton
          holdMs={0}
          shortcut="x"
          onFire={() => void actions.act({ act: 'exclude lap', lap: state.lap })}
        >
          Exclude lap {state.lap}
        </HoldButton>
        <HoldButton
          holdMs={LONG_PRESS_MS}
          shortcut="c"
          onFire={() => void actions.act({ act: 'new cell', fields: {} })}
        >
          Next cell
        </HoldButton>
      </div>
      <p class="hint">
        Keys act when <em>Keys</em> is ticked above. Press long for whatever drives an output.
      </p>
    </section>
  );
}

/** Holding is the safe direction and acts at once; letting go wants a long press. */
function Hold(props: {
  what: 'stimulus' | 'water';
  shortcut: string;
  reason: string | null;
  actions: Actions;
}) {
  const { what, shortcut, reason, actions } = props;
  const held = reason !== null;
  return (
    <div class={`hold-place ${held ? 'held' : ''}`}>
      <HoldButton
        holdMs={held ? LONG_PRESS_MS : 0}
        shortcut={shortcut}
        pressed={held}
        class={held ? 'is-held' : ''}
        onFire={() =>
          void (held ? letGo(what, actions) : actions.act({ act: 'hold', what, on: true }))
        }
      >
        {held ? `Release ${what}` : `Hold ${what}`}
      </HoldButton>
      <p class="reason">{held ? `Held: ${reason}` : ''}</p>
    </div>
  );
}

/** Stimuli may also be held because the board restarted; whoever lets go has read the reason. */
async function letGo(what: 'stimulus' | 'water', actions: Actions): Promise<void> {
  const answer = await actions.act({ act: 'hold', what, on: false });
  if (answer.done && what === 'stimulus') await actions.act({ act: 'allow stimulation' });
}

function ChoiceRow(props: { choice: Choice; chosen: Chosen | undefined; actions: Actions }) {
  const { choice, chosen, actions } = props;
  const [draft, setDraft] = useState('');
  const id = `choice-${choice.name}`;
  const unit = unitWords(choice.unit);
  const problem = draft === '' ? '' : boundsProblem(choice, draft);
  const set = () => {
    if (draft === '' || problem !== '') return;
    const value = choice.options
      ? choice.options.find((option) => String(option) === draft)!
      : Number(draft);
    setDraft('');
    void actions.act({ act: 'choose', name: choice.name, value });
  };
  return (
    <form
      class="choice"
      noValidate
      onSubmit={(event) => {
        event.preventDefault();
        set();
      }}
    >
      <label for={id}>
        {choice.name.replaceAll('_', ' ')}
        <span class="now">
          <b>{chosen ? chosen.value : '–'}</b> {unit}
        </span>
      </label>
      {choice.options ? (
        <select id={id} value={draft} onChange={(event) => setDraft(event.currentTarget.value)}>
          <option value="">change to…</option>
          {choice.options.map((option) => (
            <option key={option} value={String(option)}>
              {option}
            </option>
          ))}
        </select>
      ) : (
        <input
          id={id}
          type="number"
          inputMode="decimal"
          step="any"
          min={choice.least}
          max={choice.most}
          value={draft}
          placeholder={`${choice.least ?? ''} to ${choice.most ?? ''}`}
          aria-invalid={problem !== ''}
          aria-describedby={`${id}-says`}
          onInput={(event) => setDraft(event.currentTarget.value)}
        />
      )}
      <button type="submit" disabled={draft === '' || problem !== ''}>
        Set<span class="unseen"> {choice.name}</span>
      </button>
      <p id={`${id}-says`} class={problem === '' ? 'queued' : 'problem'}>
        {problem || queuedWords(chosen, unit)}
      </p>
    </form>
  );
}

function queuedWords(chosen: Chosen | undefined, unit: string): string {
  if (!chosen || chosen.queued === null) return '';
  return `${chosen.value} to ${chosen.queued} ${unit} from the next lap`;
}

function Note({ actions }: { actions: Actions }) {
  const input = useRef<HTMLInputElement>(null);
  useEffect(() => bindKey('n', { down: () => input.current?.focus(), up: () => undefined }), []);
  return (
    <form
      class="choice note"
      onSubmit={(event) => {
        event.preventDefault();
        const text = input.current?.value.trim() ?? '';
        if (text === '') return;
        input.current!.value = '';
        void actions.act({ act: 'note', text });
      }}
    >
      <label for="note">
        Note{' '}
        <span class="key" aria-hidden="true">
          N
        </span>
      </label>
      <input id="note" ref={input} maxLength={2000} autocomplete="off" aria-keyshortcuts="N" />
      <button type="submit">Keep</button>
    </form>
  );
}
