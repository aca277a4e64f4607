import { useState } from 'preact/hooks';
import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { AnimalField } from './animals/animalField.js';
import { HoldButton } from './holdButton.js';
import { LONG_PRESS_MS } from './keys.js';

/** Before a session: what to begin. During one: how to end it. */
export function SessionPanel({ live, actions }: { live: Live; actions: Actions }) {
  const { state } = live;
  if (state?.session === 'running') return <EndPanel live={live} actions={actions} />;
  return <BeginPanel live={live} actions={actions} />;
}

function BeginPanel({ live, actions }: { live: Live; actions: Actions }) {
  const { setup, state } = live;
  const [busy, setBusy] = useState(false);
  const files = setup?.rulesFiles ?? [];
  const begin = async (form: HTMLFormElement) => {
    const fields = new FormData(form);
    const text = (name: string) => String(fields.get(name) ?? '').trim();
    setBusy(true);
    await actions.begin({
      rules: text('rules'),
      subject: text('subject'),
      ...(text('experimenter') === '' ? {} : { experimenter: text('experimenter') }),
      ...(text('seed') === '' ? {} : { seed: text('seed') }),
      ...(text('despite') === '' ? {} : { despite: text('despite') }),
    });
    setBusy(false);
  };
  return (
    <section class="panel session-panel" aria-labelledby="begin-title">
      <h2 id="begin-title">Begin a session</h2>
      {state?.session === 'ended' ? (
        <p class="ended">
          The last session ended{state.endedBecause ? `: ${state.endedBecause}` : ''}.
        </p>
      ) : null}
      <form
        onSubmit={(event) => {
          event.preventDefault();
          void begin(event.currentTarget);
        }}
      >
        <label>
          Rules file
          <select name="rules" required>
            {files.map((file) => (
              <option key={file} value={file}>
                {file}
              </option>
            ))}
          </select>
        </label>
        <AnimalField />
        <div class="pair">
          <label>
            Experimenter
            <input name="experimenter" maxLength={64} autocomplete="off" spellcheck={false} />
          </label>
          <label>
            Seed
            <input
              name="seed"
              maxLength={64}
              autocomplete="off"
              spellcheck={false}
              placeholder="drawn anew"
            />
          </label>
        </div>
        <button type="submit" class="primary" disabled={busy || files.length === 0}>
          {busy ? 'Beginning…' : 'Begin'}
        </button>
      </form>
      <p class="caution">
        Before an animal is on the belt: an approved protocol, your local rules and trained staff.
        Lapwing is not a safety interlock; keep the manual switch within reach.
      </p>
    </section>
  );
}

function EndPanel({ live, actions }: { live: Live; actions: Actions }) {
  const [asking, setAsking] = useState(false);
  const session = live.setup?.session;
  return (
    <section class="panel session-panel" aria-labelledby="end-title">
      <h2 id="end-title">Session</h2>
      <p class="session-line">
        {session?.experimenter ? `${session.experimenter}, ` : ''}seed {session?.seed ?? '–'}
        <span class="folder">{session?.folder}</span>
      </p>
      {asking ? (
        <form
          class="end-form"
          onSubmit={(event) => {
            event.preventDefault();
            const reason = new FormData(event.currentTarget).get('reason');
            setAsking(false);
            void actions.end(String(reason ?? '').trim());
          }}
        >
          <label>
            Why it ends (kept in the record)
            <input name="reason" maxLength={200} autocomplete="off" />
          </label>
          <div class="pair">
            <button type="submit" class="primary">
              End the session
            </button>
            <button type="button" onClick={() => setAsking(false)}>
              Go on running
            </button>
          </div>
        </form>
      ) : (
        <div class="pair">
          <HoldButton
            holdMs={LONG_PRESS_MS}
            shortcut="p"
            onFire={() => void actions.act({ act: 'phase', to: 'next' })}
          >
            Next phase
          </HoldButton>
          <button type="button" onClick={() => setAsking(true)}>
            End session…
          </button>
        </div>
      )}
    </section>
  );
}
