import { momentWords } from '../../model/records.js';
import { reportAddress } from '../../stream/recordsApi.js';
import { JobLine } from './jobLine.js';
import type { SessionProps } from './sessionPanel.js';

/** The session as one page for the lab book: shown here, or in a tab of its own for printing. */
export function ReportPanel({ desk, state, session }: SessionProps) {
  const { row, made } = session;
  const { report } = made;
  const job = state.jobs.get('report');
  const busy = job?.state === 'running' || job?.state === 'waiting';
  // Another version of the page has another address, so the frame loads it.
  const address = `${reportAddress(row.name)}${report ? `?made=${encodeURIComponent(report.at)}` : ''}`;
  return (
    <section class="panel" aria-labelledby="report-title">
      <h2 id="report-title">Report</h2>
      <div class="row-of-buttons">
        {report && !report.old ? (
          <button type="button" onClick={() => desk.setReportShown(!state.reportShown)}>
            {state.reportShown ? 'Hide it' : 'Show it here'}
          </button>
        ) : null}
        <button
          type="button"
          class={report && !report.old ? '' : 'primary'}
          disabled={busy}
          onClick={() => void desk.showReport()}
        >
          {report ? 'Make it anew' : 'Make the report'}
        </button>
        {report ? (
          <>
            <a href={address} target="_blank" rel="noopener">
              Open in a new tab
            </a>
            <span class="soft">
              made {momentWords(report.at)}
              {report.old ? '; the record was changed since' : ''}
            </span>
          </>
        ) : (
          <span class="soft">Laps, licks, speed, a proof of every firing: one page.</span>
        )}
      </div>
      <JobLine desk={desk} job={job} what="Making the report" />
      {state.reportShown && report ? (
        <iframe class="report-frame" src={address} title={`Report of ${row.name}`} />
      ) : null}
    </section>
  );
}
