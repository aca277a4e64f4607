import { ComparisonPanel } from './comparisonPanel.js';
import type { RecordsDesk } from './recordsDesk.js';
import { SearchForm } from './searchForm.js';
import { SessionPanel } from './sessionPanel.js';
import { SessionTable } from './sessionTable.js';

/** Find sessions, look at one, have something made of it, compare several. */
export function RecordsPage({ desk }: { desk: RecordsDesk }) {
  const { state } = desk;
  const { notice } = state;
  return (
    <main class={`records ${state.open === undefined ? '' : 'one-open'}`} aria-label="Records">
      <div class="finding">
        <section class="panel" aria-labelledby="sessions-title">
          <h2 id="sessions-title">Sessions</h2>
          <SearchForm desk={desk} state={state} />
          <SessionTable desk={desk} state={state} />
        </section>
      </div>
      <div class="looking">
        {notice ? (
          <div class={`desk-notice ${notice.kind}`} role="alert">
            <p>
              {notice.text} <span class="soft">{notice.remedy}</span>
            </p>
            <button type="button" onClick={() => desk.dismiss()}>
              Close
            </button>
          </div>
        ) : null}
        <ComparisonPanel desk={desk} state={state} />
        <SessionPanel desk={desk} state={state} />
      </div>
    </main>
  );
}
