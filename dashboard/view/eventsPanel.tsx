import { clock } from '../model/format.js';
import { type Live, outputKind } from '../model/live.js';
import { eventWords } from '../model/words.js';

/** Rows on the page; the rest of what is kept is not worth the scrolling. */
const SHOWN = 60;

/** The newest events in words, newest first. The running seconds are of the session. */
export function EventsPanel({ live }: { live: Live }) {
  const { events, state } = live;
  const startUs = state ? state.boardUs - state.sessionS * 1e6 : 0;
  const shown = events.slice(-SHOWN).reverse();
  return (
    <section class="panel events-panel" aria-labelledby="events-title">
      <h2 id="events-title">What happened</h2>
      {shown.length === 0 ? <p class="empty">Nothing yet. Licks are drawn, not listed.</p> : null}
      {/* biome-ignore lint/a11y/noNoninteractiveTabindex: a box that scrolls must be reachable by key */}
      <ol tabIndex={0} aria-label="Recent events, newest first">
        {shown.map(({ number, event }) => {
          const told = eventWords(event, (output) => outputKind(live, output));
          return (
            <li key={number} class={told.tone}>
              <span class="when">{clock((event.boardUs - startUs) / 1e6)}</span>
              <span class="lap-number">lap {event.lap}</span>
              <span class="told">{told.text}</span>
            </li>
          );
        })}
      </ol>
    </section>
  );
}
