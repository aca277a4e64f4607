import { useEffect, useState } from 'preact/hooks';
import type { AnimalRow, AnimalsTold } from '../../../server/web/animals/animalsMessages.js';
import { dueWords, LEVEL_WORDS, LEVELS, weightWords } from '../../model/animals.js';
import { animalsApi } from '../../stream/animalsApi.js';
import { LevelShape } from '../shapes.js';

/** Told why a session of the animal will want a reason, and its card where it is kept. */
type Standing = (why: string | undefined, card: AnimalRow['card'] | undefined) => void;

/**
 * Which animal is to run, with its weight and water today, and what speaks against it; its weight of
 * the day can be entered here. The loop decides: this only says it beforehand.
 */
export function AnimalField({ onStanding }: { onStanding: Standing }) {
  const [list, setList] = useState<AnimalsTold>();
  const [name, setName] = useState('');
  useEffect(() => {
    let gone = false;
    const look = async () => {
      const told = await animalsApi.list();
      if (told.done && !gone && told.value.folder !== null) setList(told.value);
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
  const named = list !== undefined && name.trim() !== '';
  const why = named ? whyNot(name.trim(), row) : undefined;
  useEffect(() => onStanding(why, row?.card), [why, row?.card.protocol]);
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
      {named ? <StandingLine name={name.trim()} row={row} why={why} /> : null}
    </>
  );
}

function StandingLine(props: {
  name: string;
  row: AnimalRow | undefined;
  why: string | undefined;
}) {
  const { name, row, why } = props;
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
        {why}{' '}
        {row !== undefined && why !== undefined ? (
          <a href={`#animals/${encodeURIComponent(name)}`}>Its page</a>
        ) : null}
      </p>
      {row !== undefined && row.today === null ? (
        <label>
          Weight today, g
          <input
            name="grams"
            type="number"
            inputMode="decimal"
            step="any"
            min="0.1"
            max="10000"
            autocomplete="off"
          />
        </label>
      ) : null}
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
