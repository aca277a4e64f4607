import { useEffect, useState } from 'preact/hooks';
import type { AnimalRow, AnimalsTold } from '../../../server/web/animals/animalsMessages.js';
import { dueWords, LEVEL_WORDS, LEVELS, weightWords } from '../../model/animals.js';
import { animalsApi } from '../../stream/animalsApi.js';
import { LevelShape } from '../shapes.js';

/**
 * Which animal is to run, with its weight and water today; and, where something speaks against it,
 * the reason to begin all the same. The loop decides: this only says it beforehand.
 */
export function AnimalField() {
  const [list, setList] = useState<AnimalsTold>();
  const [name, setName] = useState('');
  useEffect(() => {
    let gone = false;
    const look = async () => {
      const told = await animalsApi.list();
      if (told.done && !gone) setList(told.value);
    };
    void look();
    // It may be weighed meanwhile, here or elsewhere.
    const timer = setInterval(() => void look(), 10_000);
    return () => {
      gone = true;
      clearInterval(timer);
    };
  }, []);
  const row = list?.animals.find(({ animal }) => animal === name.trim());
  return (
    <>
      <label>
        Animal
        <input
          name="subject"
          required
          maxLength={64}
          autocomplete="off"
          spellcheck={false}
          list={list ? 'kept-animals' : undefined}
          onInput={(event) => setName(event.currentTarget.value)}
        />
      </label>
      <datalist id="kept-animals">
        {list?.animals
          .filter(({ card }) => card.state !== 'left')
          .map(({ animal, card }) => (
            <option key={animal} value={animal}>
              {card.note}
            </option>
          ))}
      </datalist>
      {list !== undefined && name.trim() !== '' ? <Standing name={name.trim()} row={row} /> : null}
    </>
  );
}

function Standing({ name, row }: { name: string; row: AnimalRow | undefined }) {
  const why = whyNot(name, row);
  return (
    <>
      <p class="animal-standing" role="status">
        {row === undefined ? null : (
          <>
            <LevelShape level={row.today === null ? 'off' : LEVELS[row.today.level]} />{' '}
            {weightWords(row.today)}
            {row.today === null ? '' : `, ${LEVEL_WORDS[row.today.level]}`}
            {row.water.due === null ? '' : `; still due ${dueWords(row.water)}`}{' '}
          </>
        )}
        {why === undefined ? null : (
          <>
            {why}{' '}
            {row === undefined ? null : (
              <a href={`#animals/${encodeURIComponent(name)}`}>Weigh it first.</a>
            )}
          </>
        )}
      </p>
      {why === undefined ? null : (
        <label>
          Reason to begin all the same (kept with the session)
          <input name="despite" maxLength={500} autocomplete="off" />
        </label>
      )}
    </>
  );
}

/** What will speak against a session; the whole of it is in the loop's answer. */
function whyNot(name: string, row: AnimalRow | undefined): string | undefined {
  if (row === undefined)
    return name === 'nobody' ? undefined : 'It is not kept in the animals folder.';
  if (row.card.state === 'left') return 'It is said to be kept here no longer.';
  if (row.today === null) return 'No session begins without the weight of the day.';
  if (row.today.level === 'below') return 'The protocol and the veterinarian decide.';
  return row.water.open.length > 0 ? 'A session of today is not in the water book yet.' : undefined;
}
