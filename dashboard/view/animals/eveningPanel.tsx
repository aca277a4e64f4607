import type { AnimalsTold } from '../../../server/web/animals/animalsMessages.js';
import { dueWords } from '../../model/animals.js';
import { plural } from '../../model/format.js';
import { LevelShape } from '../shapes.js';

/** The evening round: who is still due water, with a session or without. */
export function EveningPanel({ list }: { list: AnimalsTold }) {
  const due = list.animals.filter(({ evening }) => evening !== '');
  return (
    <section class="panel" aria-labelledby="evening-title">
      <h2 id="evening-title">This evening</h2>
      {due.length === 0 ? (
        <p>
          <LevelShape level="good" /> Every animal on a water target has had its water today.
        </p>
      ) : (
        <>
          <p>
            <LevelShape level="warn" /> {plural(due.length, 'animal')} still due water:
          </p>
          <ul class="evening">
            {due.map(({ animal, water, evening }) => (
              <li key={animal}>
                <a href={`#animals/${encodeURIComponent(animal)}`}>{animal}</a>
                <strong>{dueWords(water)}</strong>
                <span class="soft">{evening}</span>
              </li>
            ))}
          </ul>
        </>
      )}
    </section>
  );
}
