import { useEffect, useState } from 'preact/hooks';
import {
  DEFAULT_KEYMAP,
  KEYED,
  KEYS_AN_ACT,
  type Keymap,
  keyLabel,
  keyProblem,
  withKey,
} from '../model/keymap.js';
import type { SoundWish } from '../model/sounds.js';
import type { Actions } from './actions.js';
import { type BrowserSettings, LEAST_LAMP } from './browserSettings.js';
import { takeNextKey } from './keys.js';

/** Light, sound and keys of this browser; nothing of it reaches the rig. */
export function BrowserPanel(props: { settings: BrowserSettings; actions: Actions }) {
  const { settings, actions } = props;
  return (
    <details class="panel browser-panel">
      <summary>
        <h2>Light, sound and keys of this screen</h2>
      </summary>
      <Light lamp={settings.lamp} actions={actions} />
      <Sound settings={settings} actions={actions} />
      <Keys keymap={settings.keymap} actions={actions} />
    </details>
  );
}

function Light({ lamp, actions }: { lamp: number; actions: Actions }) {
  return (
    <label class="slide">
      Brightness
      <input
        type="range"
        min={LEAST_LAMP}
        max={1}
        step={0.05}
        value={lamp}
        onInput={(event) => actions.setLamp(Number(event.currentTarget.value))}
      />
      <output>{Math.round(lamp * 100)} %</output>
    </label>
  );
}

const LEVEL_WORDS = { bad: 'grave', warn: 'to look at', note: 'to know' } as const;

function Sound({ settings, actions }: { settings: BrowserSettings; actions: Actions }) {
  const { sounds, soundBlocked } = settings;
  const change = (part: Partial<SoundWish>) => actions.setSounds({ ...sounds, ...part });
  return (
    <fieldset class="sounds">
      <legend>Sound</legend>
      <label class="tick">
        <input
          type="checkbox"
          checked={sounds.on}
          onChange={(event) => change({ on: event.currentTarget.checked })}
        />
        Alarms sound here
      </label>
      {sounds.on ? (
        <>
          <label class="slide">
            Volume
            <input
              type="range"
              min={0}
              max={1}
              step={0.05}
              value={sounds.volume}
              onInput={(event) => change({ volume: Number(event.currentTarget.value) })}
            />
            <output>{Math.round(sounds.volume * 100)} %</output>
          </label>
          <div class="ticks">
            {(['bad', 'warn', 'note'] as const).map((level) => (
              <label class="tick" key={level}>
                <input
                  type="checkbox"
                  checked={sounds.levels[level]}
                  onChange={(event) =>
                    change({ levels: { ...sounds.levels, [level]: event.currentTarget.checked } })
                  }
                />
                {LEVEL_WORDS[level]}
                <button type="button" onClick={() => actions.trySound(level)}>
                  Hear<span class="unseen"> what is {LEVEL_WORDS[level]}</span>
                </button>
              </label>
            ))}
          </div>
          {soundBlocked ? (
            <p class="problem" role="status">
              The browser keeps this page silent until a key or a button is pressed on it.
            </p>
          ) : null}
        </>
      ) : null}
    </fieldset>
  );
}

function Keys({ keymap, actions }: { keymap: Keymap; actions: Actions }) {
  const [taking, setTaking] = useState<{ act: string; n: number }>();
  const [problem, setProblem] = useState('');
  useEffect(() => {
    if (!taking) return undefined;
    return takeNextKey((code) => {
      setTaking(undefined);
      if (code === undefined) return;
      const why = keyProblem(keymap, taking.act, code);
      setProblem(why);
      if (why === '') actions.setKeymap(withKey(keymap, taking.act, taking.n, code));
    });
  }, [taking, keymap, actions]);
  const begin = (act: string, n: number) => {
    setProblem('');
    setTaking({ act, n });
  };
  return (
    <fieldset class="keymap">
      <legend>Keys</legend>
      <p class="hint">
        Press the button of a key, then the new key: of this keyboard, a number pad or a pedal. Esc
        leaves it as it is. Keys that drive a stimulus have to be held.
      </p>
      <p class="problem" role="alert">
        {problem}
      </p>
      <table>
        <thead class="unseen">
          <tr>
            <th scope="col">What it does</th>
            <th scope="col">Keys</th>
          </tr>
        </thead>
        <tbody>
          {KEYED.map(({ act, title }) => {
            const codes = keymap[act] ?? [];
            const rooms = Math.min(KEYS_AN_ACT, codes.length + 1);
            return (
              <tr key={act}>
                <th scope="row">{title}</th>
                <td>
                  {Array.from({ length: rooms }, (_, n) => {
                    const waits = taking?.act === act && taking.n === n;
                    const label = codes[n] === undefined ? 'add' : keyLabel(codes[n]);
                    return (
                      <button
                        key={codes[n] ?? 'add'}
                        type="button"
                        class={`cap ${codes[n] === undefined ? 'add' : ''}`}
                        aria-pressed={waits}
                        onClick={() => begin(act, n)}
                      >
                        <span class="unseen">{title}: </span>
                        {waits ? 'press a key…' : label}
                      </button>
                    );
                  })}
                  <button
                    type="button"
                    class="cap drop"
                    disabled={codes.length === 0}
                    onClick={() =>
                      actions.setKeymap(withKey(keymap, act, codes.length - 1, undefined))
                    }
                  >
                    ×<span class="unseen"> take away the last key of {title}</span>
                  </button>
                </td>
              </tr>
            );
          })}
        </tbody>
      </table>
      <button type="button" onClick={() => actions.setKeymap(DEFAULT_KEYMAP)}>
        All keys as at first
      </button>
    </fieldset>
  );
}
