import { useState } from 'preact/hooks';
import type { AnimalsAsk, AnimalTold } from '../../../server/web/animals/animalsMessages.js';
import { numberIn } from '../../model/animals.js';
import type { AnimalsProps } from './animalsPage.js';

/** A weight, and water given by hand: now, or at a time that is typed in. */
export function EntryForms({ desk, state, animal }: AnimalsProps & { animal: AnimalTold }) {
  const { busy } = state;
  const { due } = animal.water;
  return (
    <div class="entry-forms">
      <AmountForm
        {...{ busy, label: 'Weight, g, as the balance shows it', button: 'Write weight down' }}
        name="weight"
        placeholder={animal.last === null ? '' : `last ${animal.last.grams}`}
        send={(amount, more) =>
          desk.write({ do: 'weigh', animal: animal.animal, grams: amount, ...more })
        }
      />
      <AmountForm
        {...{ busy, label: 'Water given by hand, mL', button: 'Write water down' }}
        name="water"
        placeholder={due === null || due.mostUl === 0 ? '' : `due ${due.mostUl / 1_000}`}
        send={(amount, more) =>
          desk.write({
            ...{ do: 'water', animal: animal.animal },
            // Millilitres of three decimals are whole microlitres.
            ul: Math.round(amount * 1_000_000) / 1_000,
            ...more,
          })
        }
      />
    </div>
  );
}

type More = Partial<Pick<Extract<AnimalsAsk, { do: 'weigh' }>, 'at' | 'note' | 'by'>>;

function AmountForm(props: {
  name: string;
  label: string;
  button: string;
  placeholder: string;
  busy: boolean;
  send: (amount: number, more: More) => Promise<boolean>;
}) {
  const { name, label, button, placeholder, busy, send } = props;
  const [problem, setProblem] = useState('');
  const submit = (form: HTMLFormElement) => {
    const fields = new FormData(form);
    const said = (field: string) => String(fields.get(field) ?? '').trim();
    const amount = numberIn(said('amount'));
    setProblem(amount === undefined ? 'Expected a number, such as 23.4' : '');
    if (amount === undefined) return;
    const more = Object.fromEntries(
      (['at', 'note', 'by'] as const).flatMap((field) =>
        said(field) === '' ? [] : [[field, said(field)]],
      ),
    );
    void send(amount, more);
  };
  return (
    <form
      class={`amount-form ${name}-form`}
      onSubmit={(event) => {
        event.preventDefault();
        submit(event.currentTarget);
      }}
    >
      <label class="wide">
        {label}
        <input
          name="amount"
          inputMode="decimal"
          required
          autocomplete="off"
          placeholder={placeholder}
        />
      </label>
      <details>
        <summary>At another time, a note, your name</summary>
        <label>
          Time
          <input name="at" autocomplete="off" placeholder="now, or 18:30" maxLength={40} />
        </label>
        <label>
          Note
          <input name="note" autocomplete="off" maxLength={500} />
        </label>
        <label>
          By
          <input name="by" autocomplete="off" maxLength={64} />
        </label>
      </details>
      {problem === '' ? null : (
        <p class="problem" role="alert">
          {problem}
        </p>
      )}
      <button type="submit" class="primary" disabled={busy}>
        {button}
      </button>
    </form>
  );
}
