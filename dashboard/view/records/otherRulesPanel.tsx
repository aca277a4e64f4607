import type { FiringSeen } from '../../../server/session/whatIf.js';
import type { WhatIfTold } from '../../../server/web/records/recordsMessages.js';
import { clock, fixed } from '../../model/format.js';
import { ScrollBox } from '../animals/scrollBox.js';
import { JobLine } from './jobLine.js';
import type { SessionProps } from './sessionPanel.js';

/** What another rules file would have done on the same belt, firing by firing. */
export function OtherRulesPanel({ desk, state }: SessionProps) {
  const job = state.jobs.get('what if');
  const busy = job?.state === 'running' || job?.state === 'waiting';
  return (
    <section class="panel" aria-labelledby="other-title">
      <h2 id="other-title">With other rules</h2>
      <form
        class="row-of-buttons"
        onSubmit={(event) => {
          event.preventDefault();
          const rules = new FormData(event.currentTarget).get('rules');
          void desk.work({ do: 'what if', rules: String(rules) });
        }}
      >
        <label class="beside">
          Rules file
          <select name="rules" required>
            {state.rulesFiles.map((file) => (
              <option key={file} value={file}>
                {file}
              </option>
            ))}
          </select>
        </label>
        <button type="submit" disabled={busy || state.rulesFiles.length === 0}>
          See what it would have done
        </button>
      </form>
      <JobLine desk={desk} job={job} what="Running the other rules" />
      {job?.state === 'done' ? <Outcome told={job.result as WhatIfTold} /> : null}
    </section>
  );
}

function Outcome({ told }: { told: WhatIfTold }) {
  const counts = Object.entries(told.counts).filter(([, count]) => count > 0);
  return (
    <div class="verdict" role="status">
      <p>
        <strong>{told.rules}</strong> ({told.title}):{' '}
        {counts.length === 0
          ? 'no firing in either.'
          : `${counts.map(([verdict, count]) => `${count} ${verdict}`).join(', ')}.`}
      </p>
      <p class="soft">
        Movement, licks and the operator’s acts are the record’s. An animal that was given something
        else might have moved otherwise.
      </p>
      {told.rows.length > 0 ? (
        <ScrollBox label="Firings compared">
          <table class="small-rows">
            <thead>
              <tr>
                <th scope="col">Rule</th>
                <th scope="col">output</th>
                <th scope="col">lap</th>
                <th scope="col">recorded</th>
                <th scope="col">with these rules</th>
                <th scope="col">so</th>
              </tr>
            </thead>
            <tbody>
              {told.rows.map((row, n) => (
                <tr key={`${n} ${row.rule}`} class={row.verdict === 'same' ? 'faint' : ''}>
                  <th scope="row">{row.rule}</th>
                  <td>{row.output ?? '–'}</td>
                  <td>{row.lap}</td>
                  <td>{seenWords(row.recorded)}</td>
                  <td>{seenWords(row.other)}</td>
                  <td class="verdict-word">
                    {row.verdict}
                    {row.reason === null ? null : <span class="why">{row.reason}</span>}
                  </td>
                </tr>
              ))}
            </tbody>
          </table>
        </ScrollBox>
      ) : null}
      {told.rowsLeftOut > 0 ? (
        <p class="soft">{told.rowsLeftOut} more: `lapwing replay --rules` tells them all.</p>
      ) : null}
    </div>
  );
}

function seenWords(seen: FiringSeen | null): string {
  if (seen === null) return '–';
  const at = seen.positionCm === null ? '' : `, ${fixed(seen.positionCm, 1)} cm`;
  return `${seen.sham ? 'sham ' : ''}${clock(seen.timeS)}${at}`;
}
