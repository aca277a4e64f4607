import { useState } from 'preact/hooks';
import type { Live } from '../model/live.js';
import { animalsApi } from '../stream/animalsApi.js';
import type { Actions } from './actions.js';
import { AnimalField } from './animals/animalField.js';
import { EndedPanel } from './endedPanel.js';
import { PreflightLine } from './preflightLine.js';
import { LevelShape } from './shapes.js';

/** Before a session: who runs what on which rig, what speaks against it, and the beginning of it. */
export function BeginPanel({ live, actions }: { live: Live; actions: Actions }) {
  const { setup, state } = live;
  const [busy, setBusy] = useState(false);
  const [trouble, setTrouble] = useState('');
  const [animalWhy, setAnimalWhy] = useState<string>();
  const [protocol, setProtocol] = useState('');
  const [preflightAgainst, setPreflightAgainst] = useState(false);
  const files = setup?.rulesFiles ?? [];
  const begin = async (form: HTMLFormElement) => {
    const fields = new FormData(form);
    const text = (name: string) => String(fields.get(name) ?? '').trim();
    const given = (name: string) => (text(name) === '' ? {} : { [name]: text(name) });
    setBusy(true);
    setTrouble('');
    try {
      if (text('grams') !== '') {
        const grams = Number(text('grams'));
        const by = text('experimenter');
        const weighed = await animalsApi.write({
          ...{ do: 'weigh', animal: text('subject'), grams },
          ...(by === '' ? {} : { by }),
        });
        // A weight that looks mistyped is asked about on the Animals page.
        if (!weighed.done) return setTrouble(`Not begun: ${weighed.text} ${weighed.remedy}`);
      }
      await actions.begin({
        ...{ rules: text('rules'), subject: text('subject') },
        ...{ ...given('experimenter'), ...given('protocolNumber') },
        ...{ ...given('seed'), ...given('despite') },
      });
    } finally {
      setBusy(false);
    }
  };
  return (
    <section class="panel session-panel" aria-labelledby="begin-title">
      {state?.session === 'ended' ? <EndedPanel because={state.endedBecause ?? ''} /> : null}
      <h2 id="begin-title">Begin a session</h2>
      <form
        onSubmit={(event) => {
          event.preventDefault();
          void begin(event.currentTarget);
        }}
      >
        <RigLine live={live} />
        <PreflightLine simulated={setup?.simulated ?? false} onAgainst={setPreflightAgainst} />
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
        <AnimalField
          onStanding={(why, card) => {
            setAnimalWhy(why);
            setProtocol(card?.protocol ?? '');
          }}
        />
        <div class="pair">
          <label>
            Experimenter
            <input name="experimenter" maxLength={64} autocomplete="off" spellcheck={false} />
          </label>
          <label>
            Protocol number
            <input
              name="protocolNumber"
              maxLength={64}
              autocomplete="off"
              spellcheck={false}
              placeholder={protocol || 'none'}
            />
          </label>
        </div>
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
        {animalWhy !== undefined || preflightAgainst ? (
          <label>
            Reason to begin all the same (kept with the session)
            <input name="despite" maxLength={500} autocomplete="off" />
          </label>
        ) : null}
        {trouble === '' ? null : (
          <p class="problem" role="alert">
            {trouble}
          </p>
        )}
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

/** Which rig this page is for, and whether its own board answers; another board is refused. */
function RigLine({ live }: { live: Live }) {
  const { setup, state } = live;
  const link = state?.link;
  const up = link?.state === 'up';
  return (
    <p class="standing-line" role="status">
      <LevelShape level={up ? 'good' : link?.state === 'connecting' ? 'warn' : 'bad'} /> Rig{' '}
      <strong>{setup?.rig ?? '–'}</strong>
      {up ? `: board ${link.board} answers` : `: ${link?.reason || 'its board does not answer'}`}
      {up || !link?.remedy ? null : <span class="why">{link.remedy}</span>}
    </p>
  );
}
