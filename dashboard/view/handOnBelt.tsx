import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { HoldButton } from './holdButton.js';
import { keysOf, LONG_PRESS_MS } from './keys.js';
import { LevelShape } from './shapes.js';

/** Putting a hand on the belt is the safe direction and acts at once; taking it off wants longer. */
export function HandButton({ live, actions }: { live: Live; actions: Actions }) {
  const on = live.state?.handOnBelt ?? false;
  return (
    <HoldButton
      holdMs={on ? LONG_PRESS_MS : 0}
      shortcut="hand on belt"
      pressed={on}
      class={on ? 'is-held' : ''}
      onFire={() => void actions.act({ act: 'hand on belt', on: !on })}
    >
      {on ? 'Hand is off the belt' : 'Hand on the belt'}
    </HoldButton>
  );
}

/** While a hand is on the belt the page says so and nothing else as loud. */
export function HandBanner({ live }: { live: Live }) {
  const { state } = live;
  if (state?.session !== 'running' || !state.handOnBelt) return null;
  return (
    <div class="banner warn loud" role="alert">
      <LevelShape level="warn" />
      <div>
        <strong>A hand is on the belt</strong>
        <p>
          Nothing counts: no laps, no places, no licks. Water and stimulus are held. When the hand
          is off, hold <b>{keysOf('hand on belt')[0] ?? 'its button'}</b>; position is known again
          at the next seam mark. On a belt without one, first turn it to its start: where it then
          stands is 0 cm.
        </p>
      </div>
    </div>
  );
}
