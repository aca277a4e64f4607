import { useState } from 'preact/hooks';
import { plural } from '../model/format.js';
import type { Live } from '../model/live.js';
import { endWords } from '../model/phase.js';
import type { Actions } from './actions.js';
import { BeginPanel } from './beginPanel.js';
import { HoldButton } from './holdButton.js';
import { LONG_PRESS_MS } from './keys.js';

/** Before a session: what to begin. During one: how to end it. */
export function SessionPanel({ live, actions }: { live: Live; actions: Actions }) {
  const { state } = live;
  // Before the loop has said a word, nobody knows which of the two it is.
  if (state === undefined) return null;
  if (state.session === 'running') return <EndPanel live={live} actions={actions} />;
  return <BeginPanel live={live} actions={actions} />;
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
        <>
          <Ending live={live} actions={actions} />
          <Phases live={live} actions={actions} />
          <button type="button" class="wide" onClick={() => setAsking(true)}>
            End session…
          </button>
        </>
      )}
    </section>
  );
}

/** The end as far as it can be foreseen, and what puts it off. */
function Ending({ live, actions }: { live: Live; actions: Actions }) {
  const { end, putOff } = live.state!;
  const words = endWords(end);
  // By what it is measured: a time is put off by minutes, the rest by laps.
  const byTime = end !== null && end.s !== null;
  const by = byTime ? { laps: 0, minutes: 5 } : { laps: 5, minutes: 0 };
  const sofar = [
    ...(putOff.laps > 0 ? [plural(putOff.laps, 'lap')] : []),
    ...(putOff.minutes > 0 ? [`${putOff.minutes} min`] : []),
  ];
  return (
    <div class="ending">
      <p>
        {words === undefined ? 'When it ends cannot be foreseen.' : `Ends ${words}.`}
        {sofar.length > 0 ? ` Put off by ${sofar.join(' and ')}.` : ''}
      </p>
      <HoldButton
        holdMs={0}
        shortcut="put off"
        onFire={() => void actions.act({ act: 'put off', ...by })}
      >
        Put off by {byTime ? '5 min' : '5 laps'}
      </HoldButton>
    </div>
  );
}

function Phases({ live, actions }: { live: Live; actions: Actions }) {
  if ((live.setup?.session?.phases.length ?? 0) < 1) return null;
  const go = (to: 'next' | 'previous' | 'repeat') => void actions.act({ act: 'phase', to });
  return (
    <div class="three">
      <HoldButton holdMs={LONG_PRESS_MS} shortcut="previous phase" onFire={() => go('previous')}>
        Phase before
      </HoldButton>
      <HoldButton holdMs={LONG_PRESS_MS} shortcut="repeat phase" onFire={() => go('repeat')}>
        Phase again
      </HoldButton>
      <HoldButton holdMs={LONG_PRESS_MS} shortcut="next phase" onFire={() => go('next')}>
        Next phase
      </HoldButton>
    </div>
  );
}
