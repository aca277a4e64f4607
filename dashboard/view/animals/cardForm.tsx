import { useState } from 'preact/hooks';
import type { AnimalCard, AnimalTold } from '../../../server/web/animals/animalsMessages.js';
import { FIELD_WORDS, numberIn, STATE_WORDS } from '../../model/animals.js';
import type { AnimalsProps } from './animalsPage.js';
import { Caution } from './caution.js';

type Field = keyof AnimalCard;

const NUMBERS: readonly Field[] = ['baselineG', 'implantG', 'targetUl', 'leastPercent'];
const DAYS: readonly Field[] = ['bornOn', 'baselineOn'];

/** What is known of an animal: all of it for a new one, what has changed for one that is kept. */
export function CardForm({ desk, state, animal }: AnimalsProps & { animal?: AnimalTold }) {
  const [problem, setProblem] = useState('');
  const adding = animal === undefined;
  const submit = (form: HTMLFormElement) => {
    const fields = new FormData(form);
    const said = (name: string) => String(fields.get(name) ?? '').trim();
    const set = cardIn(said, animal?.card);
    if (typeof set === 'string') return setProblem(set);
    const name = adding ? said('animal') : animal.animal;
    if (adding) {
      void desk
        .write({ do: 'add', animal: name, set })
        .then((done) => done && location.assign(`#animals/${encodeURIComponent(name)}`));
      return;
    }
    if (Object.keys(set).length === 0) return setProblem('Nothing is changed yet.');
    const from = said('from');
    const reason = said('reason');
    const more = { ...(from ? { from } : {}), ...(reason ? { reason } : {}) };
    void desk.write({ do: 'change', animal: name, set, ...more });
  };
  const card = animal?.card;
  const value = (field: Field) => {
    const found = card?.[field];
    return found === undefined || found === null ? '' : String(found);
  };
  const input = (field: Field, hint = '') => {
    const shared = { name: field, defaultValue: value(field), placeholder: hint, maxLength: 500 };
    if (DAYS.includes(field)) {
      return (
        <label>
          {FIELD_WORDS[field]}
          <input type="date" name={field} defaultValue={value(field)} />
        </label>
      );
    }
    return (
      <label>
        {FIELD_WORDS[field]}
        <input {...shared} inputMode={NUMBERS.includes(field) ? 'decimal' : 'text'} />
      </label>
    );
  };
  return (
    <section class="panel" aria-labelledby="card-title">
      <h2 id="card-title">
        {adding ? 'Keep a new animal' : `Change what is known of ${animal.animal}`}
      </h2>
      <form
        class="card-form"
        onSubmit={(event) => {
          event.preventDefault();
          submit(event.currentTarget);
        }}
      >
        {adding ? (
          <label>
            name
            <input name="animal" required maxLength={40} autocomplete="off" spellcheck={false} />
          </label>
        ) : null}
        <label>
          state
          <select name="state" defaultValue={value('state') || 'restricted'}>
            {Object.entries(STATE_WORDS).map(([state, words]) => (
              <option key={state} value={state}>
                {words}
              </option>
            ))}
          </select>
        </label>
        {input('protocol')}
        {input('targetUl', 'from the protocol')}
        {input('leastPercent', '80, common practice')}
        {input('baselineG')}
        {input('baselineOn')}
        {input('implantG', 'head plate, cement, probe')}
        <label>
          implant in baseline
          <select name="implantInBaseline" defaultValue={value('implantInBaseline') || 'false'}>
            <option value="false">weighed before it was put on</option>
            <option value="true">weighed with it on</option>
          </select>
        </label>
        <label>
          sex
          <select name="sex" defaultValue={value('sex') || 'unknown'}>
            <option>female</option>
            <option>male</option>
            <option>unknown</option>
          </select>
        </label>
        {input('bornOn')}
        {input('strain')}
        {input('note')}
        {adding ? null : (
          <>
            <label>
              holds from
              <input name="from" type="date" defaultValue={animal.day} />
            </label>
            <label>
              reason
              <input name="reason" maxLength={500} autocomplete="off" />
            </label>
          </>
        )}
        {problem === '' ? null : (
          <p class="problem" role="alert">
            {problem}
          </p>
        )}
        <div class="row-of-buttons wide">
          <button type="submit" class="primary" disabled={state.busy}>
            {adding ? 'Keep this animal' : 'Write the change down'}
          </button>
          <button type="button" onClick={() => desk.setForm('none')}>
            Leave it
          </button>
        </div>
      </form>
      <Caution />
    </section>
  );
}

/** The fields that say something else than `before`; a text says which one cannot be read. */
function cardIn(
  said: (name: string) => string,
  before: AnimalCard | undefined,
): Partial<AnimalCard> | string {
  const set: Record<string, unknown> = {};
  for (const field of Object.keys(FIELD_WORDS) as Field[]) {
    const text = said(field);
    let value: unknown = text;
    if (NUMBERS.includes(field)) {
      value = text === '' ? null : numberIn(text);
      if (value === undefined) return `${FIELD_WORDS[field]}: expected a number`;
    } else if (DAYS.includes(field)) value = text === '' ? null : text;
    else if (field === 'implantInBaseline') value = text === 'true';
    // Nothing said is no word on it, but for what may be known no longer.
    if (value === null && (before === undefined || field === 'implantG')) continue;
    if (value === null && field === 'leastPercent') continue;
    if (before === undefined ? value !== '' : value !== before[field]) set[field] = value;
  }
  return set as Partial<AnimalCard>;
}
