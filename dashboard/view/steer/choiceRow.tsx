import { useState } from 'preact/hooks';
import type { Setup } from '../../../server/loop/protocol.js';
import { boundsProblem, typedValue } from '../../model/bounds.js';
import { type Chosen, changeWords } from '../../model/change.js';
import { shown, shownUnit } from '../../model/units.js';
import type { Actions } from '../actions.js';

type Choice = NonNullable<Setup['session']>['choices'][number];

/** One of the operator's choices: what it is, what it will be and from when, and whether the board has it. */
export function ChoiceRow(props: {
  choice: Choice;
  chosen: Chosen | undefined;
  /** The lap in which the board was armed by it anew, of the last change. */
  armedLap: number | undefined;
  actions: Actions;
}) {
  const { choice, chosen, armedLap, actions } = props;
  const [draft, setDraft] = useState('');
  const id = `choice-${choice.name}`;
  const { unit } = choice;
  const { word } = shownUnit(unit);
  const problem = draft === '' ? '' : boundsProblem(choice, draft);
  const bound = (value: number | undefined) =>
    value === undefined ? undefined : shown(value, unit);
  const set = () => {
    if (draft === '' || problem !== '') return;
    const value = choice.options
      ? choice.options.find((option) => String(option) === draft)!
      : typedValue(choice, draft);
    setDraft('');
    void actions.act({ act: 'choose', name: choice.name, value });
  };
  return (
    <form
      class="choice"
      noValidate
      onSubmit={(event) => {
        event.preventDefault();
        set();
      }}
    >
      <label for={id}>
        {choice.name.replaceAll('_', ' ')}
        <span class="now">
          <b>{chosen ? shown(chosen.value, unit) : '–'}</b> {word}
        </span>
      </label>
      {choice.options ? (
        <select id={id} value={draft} onChange={(event) => setDraft(event.currentTarget.value)}>
          <option value="">change to…</option>
          {choice.options.map((option) => (
            <option key={option} value={String(option)}>
              {shown(option, unit)} {typeof option === 'number' ? word : ''}
            </option>
          ))}
        </select>
      ) : (
        <input
          id={id}
          type="number"
          inputMode="decimal"
          step={bound(choice.step) ?? 'any'}
          min={bound(choice.least)}
          max={bound(choice.most)}
          value={draft}
          placeholder={`${bound(choice.least) ?? ''} to ${bound(choice.most) ?? ''}`}
          aria-invalid={problem !== ''}
          aria-describedby={`${id}-says`}
          onInput={(event) => setDraft(event.currentTarget.value)}
        />
      )}
      <button type="submit" disabled={draft === '' || problem !== ''}>
        Set<span class="unseen"> {choice.name}</span>
      </button>
      <p id={`${id}-says`} class={problem === '' ? 'queued' : 'problem'} role="status">
        {problem || changeWords(chosen, unit, armedLap)}
      </p>
    </form>
  );
}
