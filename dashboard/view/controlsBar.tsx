import { useState } from 'preact/hooks';
import { type Access, clockTime, hasControls, whyViewing } from '../model/access.js';
import type { Actions } from './actions.js';
import { HoldButton } from './holdButton.js';
import { LevelShape } from './shapes.js';

/** Who holds the controls and since when, for everybody to see; nothing where nobody signs in. */
export function ControlsBar({ access, actions }: { access: Access; actions: Actions }) {
  const [asking, setAsking] = useState<number>();
  const { you, controls } = access;
  if (!you?.signedIn || !controls) return null;
  const { holder, change } = controls;
  const mine = hasControls(access);
  // What was asked about somebody who has them no more is not asked any longer.
  const confirming = asking === change && holder !== null && !mine;
  const take = () => {
    setAsking(undefined);
    void actions.takeControls(change);
  };
  return (
    <section class={`controls-bar ${mine ? 'mine' : 'viewing'}`} aria-label="Controls">
      <p role="status">
        <LevelShape level={mine ? 'good' : 'off'} />
        <strong>{mine ? 'You hold the controls' : 'Viewing only'}</strong>
        <span>{mine && holder ? `Taken at ${clockTime(holder.since)}.` : whyViewing(access)}</span>
      </p>
      {confirming ? (
        <div class="confirm">
          <span>{holder.name} will then only be able to look. It is kept in the record.</span>
          <button type="button" class="primary" onClick={take}>
            Take them over
          </button>
          <button type="button" onClick={() => setAsking(undefined)}>
            Leave them
          </button>
        </div>
      ) : (
        <div class="confirm">
          {mine ? (
            <button type="button" onClick={() => void actions.giveUpControls()}>
              Give up the controls
            </button>
          ) : null}
          {!mine && you.role === 'operator' ? (
            <button type="button" onClick={() => (holder ? setAsking(change) : take())}>
              {holder ? `Take over from ${holder.name}…` : 'Take the controls'}
            </button>
          ) : null}
          {!mine && you.mayHold ? (
            <HoldButton
              holdMs={0}
              onFire={() => void actions.act({ act: 'hold', what: 'stimulus', on: true })}
            >
              Hold stimulus
            </HoldButton>
          ) : null}
          <span class="signed-in">
            {you.name}, {you.role}
          </span>
          <button type="button" onClick={() => void actions.signOut()}>
            Sign out
          </button>
        </div>
      )}
    </section>
  );
}
