import type { AnimalRow } from '../../../server/web/animals/animalsMessages.js';
import {
  dueWords,
  hadParts,
  LEVEL_WORDS,
  LEVELS,
  STATE_WORDS,
  weightWords,
} from '../../model/animals.js';
import { LevelShape } from '../shapes.js';
import type { AnimalsProps } from './animalsPage.js';
import { Caution } from './caution.js';

/** Every animal today: weight, water, what is due. */
export function AnimalsList({ desk, state }: AnimalsProps) {
  const { list, trouble } = state;
  const kept = list?.animals.filter(({ card }) => card.state !== 'left') ?? [];
  const gone = list?.animals.filter(({ card }) => card.state === 'left') ?? [];
  return (
    <section class="panel" aria-labelledby="animals-title">
      <h2 id="animals-title">Animals</h2>
      {trouble === undefined ? null : (
        <p class="missing" role="alert">
          {trouble.text} <span class="soft">{trouble.remedy}</span>
        </p>
      )}
      {list === undefined && trouble === undefined ? (
        <p class="empty">The animals are being read.</p>
      ) : null}
      {list === undefined ? null : (
        <>
          <p class="soft">
            {list.day}, {list.zone}
          </p>
          {list.animals.length === 0 ? (
            <p class="empty">No animal is kept here yet.</p>
          ) : (
            <table class="sessions animals-table">
              <thead>
                <tr>
                  <th scope="col">Animal</th>
                  <th scope="col">Weight today</th>
                  <th scope="col">Water today</th>
                  <th scope="col">Still due</th>
                  <th scope="col">Last session</th>
                </tr>
              </thead>
              <tbody>
                {kept.map((row) => (
                  <Row key={row.animal} row={row} open={state.open === row.animal} />
                ))}
              </tbody>
            </table>
          )}
          {gone.length === 0 ? null : (
            <details>
              <summary>Not here any more: {gone.length}</summary>
              {gone.map(({ animal }) => (
                <a key={animal} class="gone" href={`#animals/${encodeURIComponent(animal)}`}>
                  {animal}
                </a>
              ))}
            </details>
          )}
          {list.troubles.map(({ animal, what }) => (
            <p key={`${animal} ${what}`} class="missing">
              {animal}: {what}.
            </p>
          ))}
          <div class="row-of-buttons">
            <button type="button" onClick={() => desk.setForm('add')}>
              Keep a new animal…
            </button>
          </div>
          <Caution />
        </>
      )}
    </section>
  );
}

function Row({ row, open }: { row: AnimalRow; open: boolean }) {
  const { animal, card, today, water, lastSession } = row;
  return (
    <tr class={open ? 'current' : ''}>
      <th scope="row" class="title-cell">
        <a href={`#animals/${encodeURIComponent(animal)}`} aria-current={open ? 'true' : undefined}>
          {animal}
        </a>
        <span class="why soft">{STATE_WORDS[card.state]}</span>
      </th>
      <td class="standing">
        <LevelShape level={today === null ? 'off' : LEVELS[today.level]} /> {weightWords(today)}
        {today === null ? null : <span class="why">{LEVEL_WORDS[today.level]}</span>}
      </td>
      <td class="standing">
        {hadParts(water).map((part) => (
          <span key={part} class="part">
            {part}
          </span>
        ))}
      </td>
      <td class="due">{dueWords(water)}</td>
      <td class="standing">{lastSession === null ? '–' : lastSession.day}</td>
    </tr>
  );
}
