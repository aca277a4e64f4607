import type { ExportFormat } from '../../../server/web/records/recordsMessages.js';
import { bytesWords } from '../../model/format.js';
import { EXPORT_WORDS, momentWords } from '../../model/records.js';
import { downloadAddress } from '../../stream/recordsApi.js';
import { JobLine } from './jobLine.js';
import type { SessionProps } from './sessionPanel.js';

/** For other programs: make an export, take it or the whole session along as one file. */
export function ExportsPanel({
  desk,
  state,
  session,
  readable,
}: SessionProps & { readable: boolean }) {
  const { row, recordBytes } = session;
  return (
    <section class="panel" aria-labelledby="exports-title">
      <h2 id="exports-title">For other programs</h2>
      <ul class="exports">
        {readable
          ? (Object.keys(EXPORT_WORDS) as ExportFormat[]).map((to) => (
              <ExportRow key={to} desk={desk} state={state} session={session} to={to} />
            ))
          : null}
        <li>
          <div class="export-name">
            <strong>Whole session</strong>
            <span class="soft">
              the folder as a ZIP file: record ({bytesWords(recordBytes)}), copies of its files,
              what was made of it
            </span>
          </div>
          <a
            href={downloadAddress(row.name, 'session')}
            aria-label="Download: Whole session"
            download
          >
            Download
          </a>
        </li>
      </ul>
    </section>
  );
}

function ExportRow({ desk, state, session, to }: SessionProps & { to: ExportFormat }) {
  const { name, what } = EXPORT_WORDS[to];
  const made = session.made[to];
  const job = state.jobs.get(`export ${to}`);
  const busy = job?.state === 'running' || job?.state === 'waiting';
  return (
    <li>
      <div class="export-name">
        <strong>{name}</strong>
        <span class="soft">
          {what}
          {made ? `; ${bytesWords(made.bytes)}, made ${momentWords(made.at)}` : ''}
          {made?.old ? '; the record was changed since' : ''}
        </span>
      </div>
      <button
        type="button"
        disabled={busy}
        aria-label={`${made ? 'Make anew' : 'Make'}: ${name}`}
        onClick={() => void desk.work({ do: 'export', to })}
      >
        {made ? 'Make anew' : 'Make'}
      </button>
      {made ? (
        <a href={downloadAddress(session.row.name, to)} aria-label={`Download: ${name}`} download>
          Download
        </a>
      ) : null}
      <JobLine desk={desk} job={job} what={`Exporting: ${name}`} />
    </li>
  );
}
