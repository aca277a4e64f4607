import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { HandButton } from './handOnBelt.js';
import { HoldButton } from './holdButton.js';
import { LONG_PRESS_MS } from './keys.js';
import { CellForm } from './steer/cellForm.js';
import { ChoiceRow } from './steer/choiceRow.js';
import { NoteRow } from './steer/noteRow.js';
import { Wishes } from './steer/wishes.js';

/** What an operator may change while the animal runs. */
export function SteerPanel({ live, actions }: { live: Live; actions: Actions }) {
  const session = live.setup?.session;
  const { state } = live;
  if (!session || state?.session !== 'running') return null;
  const box = live.setup?.buttonBox ?? [];
  const exclude = (lap: number) => void actions.act({ act: 'exclude lap', lap });
  return (
    <section class="panel steer-panel" aria-labelledby="steer-title">
      <h2 id="steer-title">Steer</h2>
      <div class="pair">
        <Hold what="stimulus" reason={state.held.stimulus} actions={actions} />
        <Hold what="water" reason={state.held.water} actions={actions} />
      </div>
      <Wishes session={session} state={state} actions={actions} />
      {session.choices.map((choice) => (
        <ChoiceRow
          key={choice.name}
          choice={choice}
          chosen={state.choices.find((one) => one.name === choice.name)}
          armedLap={live.armedAnew.get(choice.name)}
          actions={actions}
        />
      ))}
      <NoteRow marks={state.marks} actions={actions} />
      <div class="pair">
        <HoldButton holdMs={0} shortcut="exclude this" onFire={() => exclude(state.lap)}>
          Exclude lap {state.lap}
        </HoldButton>
        <HoldButton
          holdMs={0}
          shortcut="exclude last"
          disabled={state.lap < 1}
          onFire={() => exclude(state.lap - 1)}
        >
          Exclude lap {Math.max(0, state.lap - 1)}
        </HoldButton>
      </div>
      <CellForm cell={state.cell} fields={live.setup?.cellFields ?? []} actions={actions} />
      <HandButton live={live} actions={actions} />
      {box.length > 0 ? (
        <p class="hint">
          Button box:{' '}
          {box.map(({ input, does }) => `${input.replaceAll('_', ' ')} (${does})`).join(', ')}.
        </p>
      ) : null}
      <p class="hint">
        Keys act when <em>Keys</em> is ticked above; they can be changed below. Press long for
        whatever drives an output or lets one go.
      </p>
    </section>
  );
}

/** Holding is the safe direction and acts at once; letting go wants a long press. */
function Hold(props: { what: 'stimulus' | 'water'; reason: string | null; actions: Actions }) {
  const { what, reason, actions } = props;
  const held = reason !== null;
  return (
    <div class={`hold-place ${held ? 'held' : ''}`}>
      <HoldButton
        holdMs={held ? LONG_PRESS_MS : 0}
        shortcut={`hold ${what}`}
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
