import type { Animals } from '../../model/animals.js';
import { AnimalPanels } from './animalPanels.js';
import type { AnimalsDesk } from './animalsDesk.js';
import { AnimalsList } from './animalsList.js';
import { CardForm } from './cardForm.js';
import { EveningPanel } from './eveningPanel.js';

export interface AnimalsProps {
  readonly desk: AnimalsDesk;
  readonly state: Animals;
}

/** Who is kept, who is due water this evening, and one animal with all that was kept of it. */
export function AnimalsPage({ desk }: { desk: AnimalsDesk }) {
  const { state } = desk;
  const props = { desk, state };
  return (
    <main
      class={`records animals ${state.open === undefined ? '' : 'one-open'}`}
      aria-label="Animals"
    >
      <div class="finding">
        <AnimalsList {...props} />
        {state.list === undefined ? null : <EveningPanel list={state.list} />}
      </div>
      <div class="looking">
        <Said {...props} />
        {state.form === 'add' ? <CardForm {...props} key={`add ${state.written}`} /> : null}
        <AnimalPanels {...props} />
      </div>
    </main>
  );
}

/** What was not written down, and why; with a way to insist where it only looked mistyped. */
function Said({ desk, state }: AnimalsProps) {
  const { notice, doubted } = state;
  if (notice === undefined) return null;
  return (
    <div class={`desk-notice ${notice.kind}`} role="alert">
      <p>
        {notice.text} <span class="soft">{notice.remedy}</span>
      </p>
      {doubted === undefined ? null : (
        <button type="button" onClick={() => desk.insist()}>
          It is right: write it down
        </button>
      )}
      <button type="button" onClick={() => desk.dismiss()}>
        Close
      </button>
    </div>
  );
}
