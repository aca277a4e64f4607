import type { ReplayTold } from '../../../server/web/records/recordsMessages.js';
import { plural } from '../../model/format.js';
import { LevelShape } from '../shapes.js';
import { JobLine } from './jobLine.js';
import type { SessionProps } from './sessionPanel.js';

/** The record through the engine again, now: whether every decision comes out the same. */
export function ReplayPanel({ desk, state }: SessionProps) {
  const job = state.jobs.get('replay');
  const busy = job?.state === 'running' || job?.state === 'waiting';
  return (
    <section class="panel" aria-labelledby="replay-title">
      <h2 id="replay-title">Replay</h2>
      <div class="row-of-buttons">
        <button type="button" disabled={busy} onClick={() => void desk.work({ do: 'replay' })}>
          Replay it
        </button>
        <span class="soft">
          Feeds the record through the engine again and compares every decision and command.
        </span>
      </div>
      <JobLine desk={desk} job={job} what="Replaying" />
      {job?.state === 'done' ? <Verdict told={job.result as ReplayTold} /> : null}
    </section>
  );
}

function Verdict({ told }: { told: ReplayTold }) {
  const { inputs, decisions, commands, difference, missing } = told;
  const counts = `${plural(inputs, 'input')}, ${plural(decisions, 'decision')} and ${plural(commands, 'command')} compared`;
  return (
    <div class="verdict" role="status">
      <p>
        <LevelShape level={difference === null ? 'good' : 'bad'} />{' '}
        <strong>
          {difference === null ? 'Identical' : `Different at input ${difference.input}`}
        </strong>
        : {counts}.
      </p>
      {difference === null ? null : (
        <dl class="facts">
          <div class="fact">
            <dt>The record says</dt>
            <dd>{difference.recorded ?? 'nothing'}</dd>
          </div>
          <div class="fact">
            <dt>The replay says</dt>
            <dd>{difference.replayed ?? 'nothing'}</dd>
          </div>
        </dl>
      )}
      {missing.map((sentence) => (
        <p key={sentence} class="reason">
          {sentence}
        </p>
      ))}
    </div>
  );
}
