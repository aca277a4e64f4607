import { clock } from '../model/format.js';
import type { Freshness } from '../model/freshness.js';
import type { Live } from '../model/live.js';
import type { Actions, Theme } from './actions.js';
import { PAGES } from './pages.js';
import { Crest } from './shapes.js';

const THEMES: readonly [Theme, string][] = [
  ['dark', 'Dark'],
  ['red', 'Red'],
  ['light', 'Light'],
];

/** Which rig, which animal, how far; the theme; and the stop that never scrolls away. */
export function TopBar(props: {
  live: Live;
  freshness: Freshness;
  page: string;
  theme: Theme;
  keys: boolean;
  escapeHeld: boolean;
  actions: Actions;
}) {
  const { live, freshness, theme, keys, actions } = props;
  const { setup, state } = live;
  const session = setup?.session;
  return (
    <header class="top">
      <div class="brand">
        <Crest />
        <h1>Lapwing</h1>
      </div>
      <nav class="pages" aria-label="Pages">
        {PAGES.map(({ name, title }) => (
          <a key={name} href={`#${name}`} aria-current={props.page === name ? 'page' : undefined}>
            {title}
          </a>
        ))}
      </nav>
      <p class="where">
        <strong>{setup ? setup.rig : 'no rig yet'}</strong>
        {setup?.simulated ? <span class="tag">simulated</span> : null}
        {session ? <span class="subject">{session.subject}</span> : null}
        {session ? <span class="title">{session.title}</span> : null}
        {session?.blinded ? <span class="tag">arm sealed</span> : null}
      </p>
      <p class="session-state" role="status">
        <span class={`tag session-${freshness.fresh ? (state?.session ?? 'idle') : 'stale'}`}>
          {freshness.fresh ? (state?.session ?? 'idle') : 'stale'}
        </span>
      </p>
      <p class={`session-clock ${freshness.fresh ? '' : 'stale'}`} aria-hidden="true">
        {state && state.session !== 'idle' ? clock(state.sessionS) : '0:00'}
      </p>
      <div class="options">
        <fieldset class="themes">
          <legend class="unseen">Theme</legend>
          {THEMES.map(([name, word]) => (
            <label key={name}>
              <input
                type="radio"
                name="theme"
                checked={theme === name}
                onChange={() => actions.setTheme(name)}
              />
              <span>{word}</span>
            </label>
          ))}
        </fieldset>
        <label class="keys-switch">
          <input
            type="checkbox"
            checked={keys}
            onChange={(event) => actions.setKeys(event.currentTarget.checked)}
          />
          <span>Keys</span>
        </label>
      </div>
      <button
        type="button"
        class={`stop ${props.escapeHeld ? 'holding' : ''}`}
        aria-keyshortcuts="Escape"
        onPointerDown={(event) => {
          if (event.button === 0) actions.stopEverything();
        }}
        onKeyDown={(event) => {
          if (event.key !== 'Enter' && event.key !== ' ') return;
          event.preventDefault();
          if (!event.repeat) actions.stopEverything();
        }}
        onClick={(event) => {
          if (event.detail === 0) actions.stopEverything();
        }}
      >
        <span class="stop-word">Stop everything</span>
        <span class="key" aria-hidden="true">
          hold Esc
        </span>
      </button>
    </header>
  );
}
