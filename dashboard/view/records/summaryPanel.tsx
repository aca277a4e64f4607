import type {
  ErrorsTold,
  FiringTold,
  RuleTold,
} from '../../../server/web/records/recordsMessages.js';
import { clock, fixed, plural } from '../../model/format.js';
import { ScrollBox } from '../animals/scrollBox.js';
import { RuleCounts } from '../ruleCounts.js';
import { JobLine } from './jobLine.js';
import type { SessionProps } from './sessionPanel.js';

/** What happened: laps, licks, water, what each rule did and how near its place, every firing. */
export function SummaryPanel({ desk, state, session }: SessionProps) {
  const { summary } = session;
  return (
    <section class="panel" aria-labelledby="summary-title">
      <h2 id="summary-title">What happened</h2>
      <JobLine desk={desk} job={state.jobs.get('summary')} what="Reading the record" />
      {summary ? (
        <>
          <p>
            <strong>
              {plural(summary.laps, 'lap')} in {fixed(summary.minutes, 1)} min,{' '}
              {plural(summary.licks, 'lick')}, {fixed(summary.waterUl, 1)} µL of water.
            </strong>
          </p>
          <RulesTable rules={summary.rules} />
          {summary.notes.length > 0 ? (
            <details>
              <summary>{plural(summary.notes.length, 'note')}</summary>
              <ol class="notes">
                {summary.notes.map(({ timeS, text }) => (
                  <li key={`${timeS} ${text}`}>
                    <span class="when">{clock(timeS)}</span> {text}
                  </li>
                ))}
              </ol>
            </details>
          ) : null}
          {summary.firings.length > 0 ? (
            <details>
              <summary>Every firing: {summary.firings.length + summary.firingsLeftOut}</summary>
              <Firings firings={summary.firings} />
              {summary.firingsLeftOut > 0 ? (
                <p class="soft">{summary.firingsLeftOut} more are in the report and the tables.</p>
              ) : null}
            </details>
          ) : null}
        </>
      ) : null}
    </section>
  );
}

function RulesTable({ rules }: { rules: readonly RuleTold[] }) {
  return (
    <table class="rules-table">
      <thead>
        <tr>
          <th scope="col">Rule</th>
          <th scope="col">fired</th>
          <th scope="col">sham</th>
          <th scope="col">not</th>
          <th scope="col">board, mm off</th>
          <th scope="col">host, mm off</th>
        </tr>
      </thead>
      <tbody>
        {rules.map((rule) => (
          <tr key={rule.name}>
            <RuleCounts rule={rule} />
            <td>{errorWords(rule.armed)}</td>
            <td>{errorWords(rule.host)}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

function errorWords(errors: ErrorsTold | null): string {
  if (errors === null) return '–';
  return `${fixed(errors.medianMm, 1)} (most ${fixed(errors.worstMm, 1)})`;
}

function Firings({ firings }: { firings: readonly FiringTold[] }) {
  return (
    <ScrollBox label="Firings">
      <table class="small-rows">
        <thead>
          <tr>
            <th scope="col">Time</th>
            <th scope="col">lap</th>
            <th scope="col">rule</th>
            <th scope="col">output</th>
            <th scope="col">at, cm</th>
            <th scope="col">meant, cm</th>
            <th scope="col">off, mm</th>
            <th scope="col">by</th>
          </tr>
        </thead>
        <tbody>
          {firings.map((one) => (
            <tr key={`${one.timeS} ${one.rule} ${one.output}`}>
              <th scope="row">{clock(one.timeS)}</th>
              <td>{one.lap}</td>
              <td>{one.rule}</td>
              <td>{one.sham ? 'sham' : (one.output ?? '–')}</td>
              <td>{fixed(one.atCm, 2)}</td>
              <td>{fixed(one.placeCm, 2)}</td>
              <td>{fixed(one.errorMm, 2)}</td>
              <td>{one.armed ? 'board' : 'host'}</td>
            </tr>
          ))}
        </tbody>
      </table>
    </ScrollBox>
  );
}
