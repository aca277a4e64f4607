import type { AnimalTold } from '../../../server/web/animals/animalsMessages.js';
import {
  dueWords,
  hadParts,
  LEVEL_WORDS,
  LEVELS,
  millilitres,
  STATE_WORDS,
  weightWords,
  whenWords,
} from '../../model/animals.js';
import { LevelShape } from '../shapes.js';
import type { AnimalsProps } from './animalsPage.js';
import { CardForm } from './cardForm.js';
import { Caution } from './caution.js';
import { EntriesPanel } from './entriesPanel.js';
import { EntryForms } from './entryForms.js';
import { ScrollBox } from './scrollBox.js';
import { WaterChart } from './waterChart.js';
import { WeightChart } from './weightChart.js';

/** One animal: today, forms to weigh and to water, charts, sessions, every entry. */
export function AnimalPanels(props: AnimalsProps) {
  const { desk, state } = props;
  const { animal, open } = state;
  if (open === undefined) {
    return state.form === 'add' ? null : (
      <section class="panel choose">
        <p class="empty">Choose an animal to weigh it, to write water down, and to see its days.</p>
      </section>
    );
  }
  if (animal === undefined) return <p class="loading">{open} is being read.</p>;
  return (
    <>
      <a class="back-link" href="#animals">
        All animals
      </a>
      <section class="panel facts-panel" aria-labelledby="animal-title">
        <h2 id="animal-title">{animal.animal}</h2>
        <Today animal={animal} />
        <EntryForms {...props} animal={animal} key={`${open} ${state.written}`} />
        <div class="row-of-buttons">
          <button type="button" onClick={() => desk.setForm('change')}>
            Change what is known…
          </button>
        </div>
        <Caution />
      </section>
      {state.form === 'change' ? (
        <CardForm {...props} animal={animal} key={`change ${open}`} />
      ) : null}
      <section class="panel" aria-labelledby="weights-title">
        <h2 id="weights-title">Weight, % of the corrected baseline</h2>
        <WeightChart animal={animal} />
      </section>
      <section class="panel" aria-labelledby="days-title">
        <h2 id="days-title">Water by day, mL</h2>
        <WaterChart animal={animal} />
      </section>
      <SessionsPanel animal={animal} />
      <EntriesPanel {...props} animal={animal} />
    </>
  );
}

function Today({ animal }: { animal: AnimalTold }) {
  const { card, today, water } = animal;
  const had = hadParts(water);
  return (
    <dl class="facts">
      <Fact name="Weight today">
        <LevelShape level={today === null ? 'off' : LEVELS[today.level]} /> {weightWords(today)}
        {today === null ? null : <span class="why">{LEVEL_WORDS[today.level]}</span>}
      </Fact>
      <Fact name="Alarm below">
        {card.leastPercent} % of{' '}
        {card.baselineG === null ? 'no baseline yet' : `${card.baselineG} g`}
        {card.implantG > 0 ? <span class="why">implant of {card.implantG} g taken off</span> : null}
      </Fact>
      <Fact name="Water today">{had.length === 0 ? 'none' : had.join(', ')}</Fact>
      <Fact name="Still due">
        {water.targetUl === null
          ? STATE_WORDS[card.state]
          : `${dueWords(water)} of ${millilitres(water.targetUl)}`}
      </Fact>
      <Fact name="Protocol">{card.protocol || 'not said'}</Fact>
      <Fact name="Animal">
        {[card.sex, card.bornOn === null ? '' : `born ${card.bornOn}`, card.strain, card.note]
          .filter((part) => part !== '')
          .join(', ')}
      </Fact>
    </dl>
  );
}

function Fact({ name, children }: { name: string; children: preact.ComponentChildren }) {
  return (
    <div class="fact">
      <dt>{name}</dt>
      <dd>{children}</dd>
    </div>
  );
}

function SessionsPanel({ animal }: { animal: AnimalTold }) {
  const { sessions } = animal;
  if (sessions.length === 0) return null;
  return (
    <section class="panel" aria-labelledby="animal-sessions-title">
      <h2 id="animal-sessions-title">Sessions</h2>
      <ScrollBox label="Sessions as a table">
        <table class="small-rows animals-table">
          <thead>
            <tr>
              <th scope="col">Began</th>
              <th scope="col">Rig</th>
              <th scope="col">Water</th>
              <th scope="col">Perhaps not drunk</th>
            </tr>
          </thead>
          <tbody>
            {sessions.map(({ session, at, rig, water, override, correction }) => (
              <tr key={session}>
                <th scope="row">
                  <a href={`#records/${encodeURIComponent(session)}`}>{whenWords(at)}</a>
                  {override === null ? null : (
                    <span class="why">
                      although {override.against.join('; ')}: “{override.reason}”
                    </span>
                  )}
                </th>
                <td>{rig}</td>
                <td>
                  {water === null ? 'not in the book yet' : millilitres(water.givenUl)}
                  {correction === null ? null : <span class="why">corrected: {correction}</span>}
                </td>
                <td>{water === null ? '' : `${water.notLickedDrops} of ${water.drops} drops`}</td>
              </tr>
            ))}
          </tbody>
        </table>
      </ScrollBox>
    </section>
  );
}
