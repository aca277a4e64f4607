import { alarmsOf } from '../model/alarms.js';
import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { LevelShape } from './shapes.js';

/** What to look at, each with its remedy; one that was seen stays away until it comes anew. */
export function AlarmsPanel({ live, actions }: { live: Live; actions: Actions }) {
  const alarms = alarmsOf(live.alarms, live.state);
  return (
    <section class="alarms" aria-label="Alarms" aria-live="polite">
      {alarms.map(({ id, level, text, remedy }) => (
        <div key={id} class={`alarm ${level}`}>
          <LevelShape level={level} />
          <p>
            <strong>{text}</strong> <span>{remedy}</span>
          </p>
          <button type="button" onClick={() => actions.acknowledge(id)}>
            Seen<span class="unseen">: {text}</span>
          </button>
        </div>
      ))}
    </section>
  );
}
