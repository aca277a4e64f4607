import { useState } from 'preact/hooks';
import type { AnimalTold, Entry } from '../../../server/web/animals/animalsMessages.js';
import { entryWords, millilitres, numberIn, whenWords } from '../../model/animals.js';
import type { AnimalsProps } from './animalsPage.js';

/** Everything that was ever written down of the animal, the newest first; what is wrong is corrected. */
export function EntriesPanel(props: AnimalsProps & { animal: AnimalTold }) {
  const { animal } = props;
  const [correcting, setCorrecting] = useState('');
  const corrected = new Map(
    animal.entries.flatMap((entry) => (entry.kind === 'correction' ? [[entry.of, entry]] : [])),
  );
  return (
    <section class="panel" aria-labelledby="entries-title">
      <h2 id="entries-title">Every entry</h2>
      {animal.troubles.map(({ what }) => (
        <p key={what} class="missing">
          {what}.
        </p>
      ))}
      {/* biome-ignore lint/a11y/noNoninteractiveTabindex: a box that scrolls must be reachable by key */}
      <ol class="entries rows-box" tabIndex={0} aria-labelledby="entries-title">
        {animal.entries.map((entry) => (
          <li key={entry.id} class={corrected.has(entry.id) ? 'corrected' : ''}>
            <span class="when">
              {whenWords('at' in entry && entry.at ? entry.at : entry.written)}
            </span>
            <span class="what">{entryWords(entry)}</span>
            <span class="who soft">
              {entry.by || 'nobody named'}, {entry.computer}
            </span>
            {isCorrectable(entry) ? (
              <button type="button" onClick={() => setCorrecting(entry.id)}>
                Correct…
              </button>
            ) : null}
            {correcting === entry.id ? (
              <CorrectForm {...props} entry={entry} done={() => setCorrecting('')} />
            ) : null}
          </li>
        ))}
      </ol>
      <p class="hint">An entry is never changed: a correction is a new one that names it.</p>
    </section>
  );
}

function isCorrectable({ kind }: Entry): boolean {
  return kind === 'weight' || kind === 'water' || kind === 'session ended';
}

function CorrectForm({
  desk,
  state,
  animal,
  entry,
  done,
}: AnimalsProps & { animal: AnimalTold; entry: Entry; done: () => void }) {
  const weight = entry.kind === 'weight';
  const send = async (form: HTMLFormElement) => {
    const fields = new FormData(form);
    const text = String(fields.get('amount') ?? '').trim();
    const amount = numberIn(text);
    if (text !== '' && amount === undefined) return;
    const to =
      amount === undefined
        ? {}
        : weight
          ? { grams: amount }
          : { ul: Math.round(amount * 1_000_000) / 1_000 };
    const reason = String(fields.get('reason') ?? '').trim();
    const ask = { do: 'correct', animal: animal.animal, of: entry.id, reason, ...to } as const;
    if (await desk.write(ask)) done();
  };
  return (
    <form
      class="correct-form"
      onSubmit={(event) => {
        event.preventDefault();
        void send(event.currentTarget);
      }}
    >
      <label>
        {weight ? 'Right weight, g' : 'Right amount, mL'}
        <input
          name="amount"
          inputMode="decimal"
          autocomplete="off"
          placeholder="empty: strike it out"
          pattern="\s*\d+([.,]\d+)?\s*(g|mL)?\s*"
          title={weight ? 'grams, such as 23.4' : `now ${entryAmount(entry)}`}
        />
      </label>
      <label>
        Why
        <input name="reason" required maxLength={500} autocomplete="off" />
      </label>
      <button type="submit" class="primary" disabled={state.busy}>
        Write the correction down
      </button>
      <button type="button" onClick={done}>
        Leave it
      </button>
    </form>
  );
}

function entryAmount(entry: Entry): string {
  if (entry.kind === 'water') return millilitres(entry.ul);
  return entry.kind === 'session ended' ? millilitres(entry.water.givenUl) : '';
}
