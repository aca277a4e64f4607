import type { DayTold, LearningTold } from '../../../server/web/records/recordsMessages.js';
import { fixed } from '../../model/format.js';
import { momentWords, type Records } from '../../model/records.js';
import { comparisonAddress } from '../../stream/recordsApi.js';
import { JobLine } from './jobLine.js';
import type { RecordsDesk } from './recordsDesk.js';
import { TrendPlot } from './trendPlot.js';

/** Learning across the sessions that were ticked: a row and a point for each. */
export function ComparisonPanel({ desk, state }: { desk: RecordsDesk; state: Records }) {
  const job = state.comparison;
  if (!job) return null;
  const days = job.state === 'done' ? inOrder((job.result as LearningTold).days) : [];
  return (
    <section class="panel comparison-panel" aria-labelledby="comparison-title">
      <h2 id="comparison-title">
        {days.length > 0 ? `${days[0]!.subject}: ${days.length} sessions` : 'Comparing'}
      </h2>
      <JobLine desk={desk} job={job} what="Comparing" />
      {days.length > 0 ? (
        <>
          <div class="trends">
            <TrendPlot days={days} label="laps/min" of={(day) => day.lapsPerMinute} />
            <TrendPlot days={days} label="lick share" of={(day) => day.lickShare} most={1} />
            <TrendPlot days={days} label="slowing" of={(day) => day.slowing} />
            <TrendPlot days={days} label="water, µL" of={(day) => day.waterUl} />
          </div>
          <table class="small-rows">
            <thead>
              <tr>
                <th scope="col">Started</th>
                <th scope="col">min</th>
                <th scope="col">laps</th>
                <th scope="col">laps/min</th>
                <th scope="col">lick share</th>
                <th scope="col">slowing</th>
                <th scope="col">water, µL</th>
                <th scope="col">learned at lap</th>
              </tr>
            </thead>
            <tbody>
              {days.map((day) => (
                <tr key={day.name}>
                  <th scope="row">
                    <a href={`#records/${encodeURIComponent(day.name)}`}>
                      {momentWords(day.startedAt)}
                    </a>
                  </th>
                  <td>{fixed(day.minutes, 1)}</td>
                  <td>{day.laps}</td>
                  <td>{fixed(day.lapsPerMinute, 2)}</td>
                  <td>{fixed(day.lickShare, 2)}</td>
                  <td>{fixed(day.slowing, 2)}</td>
                  <td>{fixed(day.waterUl, 1)}</td>
                  <td>{fixed(day.learnedAtLap, 0)}</td>
                </tr>
              ))}
            </tbody>
          </table>
          <p class="hint">
            Lick share: of licks that wait for water, those at the spout or just before it. Slowing:
            speed before the spout over speed elsewhere; below 1 it slows. One animal: across
            animals the unit is the animal.
          </p>
          <div class="row-of-buttons">
            <a href={comparisonAddress(job.id)} target="_blank" rel="noopener">
              As a page in a new tab
            </a>
            <button type="button" onClick={() => desk.untickAll()}>
              Close
            </button>
          </div>
        </>
      ) : null}
    </section>
  );
}

function inOrder(days: readonly DayTold[]): DayTold[] {
  return [...days].sort((a, b) => Date.parse(a.startedAt) - Date.parse(b.startedAt));
}
