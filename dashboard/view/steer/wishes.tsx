import { useState } from 'preact/hooks';
import type { Setup, Snapshot } from '../../../server/loop/protocol.js';
import { slotAct } from '../../model/keymap.js';
import { askedWords } from '../../model/phase.js';
import type { Actions } from '../actions.js';
import { HoldButton } from '../holdButton.js';
import { LONG_PRESS_MS } from '../keys.js';

type Session = NonNullable<Setup['session']>;
type Wish = Session['asks'][number];
type Rule = Snapshot['rules'][number];

/** The rules file's buttons, and the rules that may be asked for; each has a key in this order. */
export function Wishes(props: { session: Session; state: Snapshot; actions: Actions }) {
  const { session, state, actions } = props;
  let slot = 0;
  const nextKey = () => {
    const shortcut = slotAct(slot++);
    return shortcut === undefined ? {} : { shortcut };
  };
  return (
    <>
      {session.buttons.length > 0 ? (
        <div class="buttons">
          {session.buttons.map((button) => (
            <HoldButton
              key={button}
              holdMs={LONG_PRESS_MS}
              {...nextKey()}
              onFire={() => void actions.act({ act: 'press', button })}
            >
              {button.replaceAll('_', ' ')}
            </HoldButton>
          ))}
        </div>
      ) : null}
      {session.asks.map((wish) => (
        <WishRow
          key={wish.rule}
          wish={wish}
          rule={state.rules.find(({ name }) => name === wish.rule)}
          lap={state.lap}
          nextLapKey={wish.laps > 0 ? nextKey() : {}}
          nowKey={wish.now ? nextKey() : {}}
          actions={actions}
        />
      ))}
    </>
  );
}

interface WishRowProps {
  readonly wish: Wish;
  readonly rule: Rule | undefined;
  readonly lap: number;
  readonly nextLapKey: { shortcut?: `slot ${number}` };
  readonly nowKey: { shortcut?: `slot ${number}` };
  readonly actions: Actions;
}

/** A rule that the file lets be asked for: in the next laps, or at once; and what is still to come. */
function WishRow({ wish, rule, lap, nextLapKey, nowKey, actions }: WishRowProps) {
  const [laps, setLaps] = useState(1);
  const ask = (count: number) => void actions.act({ act: 'ask', rule: wish.rule, laps: count });
  const name = wish.rule.replaceAll('_', ' ');
  const asked = rule?.asked ?? null;
  return (
    <fieldset class="wish">
      <legend>Ask for {name}</legend>
      <div class="buttons">
        {wish.laps > 0 ? (
          <HoldButton holdMs={LONG_PRESS_MS} {...nextLapKey} onFire={() => ask(laps)}>
            {laps === 1 ? 'Next lap' : `Next ${laps} laps`}
          </HoldButton>
        ) : null}
        {wish.now ? (
          <HoldButton holdMs={LONG_PRESS_MS} {...nowKey} onFire={() => ask(0)}>
            Now
          </HoldButton>
        ) : null}
      </div>
      {wish.laps > 1 ? (
        <label class="laps">
          for{' '}
          <input
            type="number"
            min={1}
            max={wish.laps}
            step={1}
            value={laps}
            onInput={(event) => {
              const wanted = Math.floor(Number(event.currentTarget.value));
              if (wanted >= 1 && wanted <= wish.laps) setLaps(wanted);
            }}
          />{' '}
          of at most {wish.laps} laps
        </label>
      ) : null}
      <p class="pending" role="status">
        {asked === null ? null : (
          <>
            <strong>
              {name}: {askedWords(asked, lap)}
            </strong>
            <button
              type="button"
              onClick={() => void actions.act({ act: 'withdraw', rule: wish.rule })}
            >
              Take back<span class="unseen"> what was asked of {name}</span>
            </button>
          </>
        )}
      </p>
    </fieldset>
  );
}
