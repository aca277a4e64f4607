import type { SessionState } from '../../../server/web/records/recordsMessages.js';
import { isNarrowed, type Records } from '../../model/records.js';
import type { RecordsDesk } from './recordsDesk.js';

const STATES: readonly [SessionState, string][] = [
  ['any', 'All'],
  ['ended', 'Ended'],
  ['recording', 'Being recorded'],
  ['trouble', 'Want looking at'],
];

/** What the sessions shown must fit; every field narrows them further. */
export function SearchForm({ desk, state }: { desk: RecordsDesk; state: Records }) {
  const { query, list } = state;
  return (
    <search>
      <form class="search-form" onSubmit={(event) => event.preventDefault()}>
        <label class="wide">
          Words in it
          <input
            type="search"
            maxLength={200}
            value={query.text ?? ''}
            placeholder="title, experimenter, protocol, reason…"
            onInput={(event) => desk.search({ text: event.currentTarget.value }, true)}
          />
        </label>
        <button
          type="button"
          disabled={!isNarrowed(query)}
          onClick={() => {
            const { sort, order } = query;
            desk.setQuery({ ...(sort ? { sort } : {}), ...(order ? { order } : {}) });
          }}
        >
          Clear
        </button>
        <label>
          Animal
          <select
            value={query.subject ?? ''}
            onChange={(event) => desk.search({ subject: event.currentTarget.value })}
          >
            <option value="">all</option>
            {(list?.subjects ?? []).map(({ subject, sessions }) => (
              <option key={subject} value={subject}>
                {subject} ({sessions})
              </option>
            ))}
          </select>
        </label>
        <label>
          Rules file
          <select
            value={query.rules ?? ''}
            onChange={(event) => desk.search({ rules: event.currentTarget.value })}
          >
            <option value="">all</option>
            {(list?.rules ?? []).map((name) => (
              <option key={name} value={name}>
                {name}
              </option>
            ))}
          </select>
        </label>
        <label>
          From day
          <input
            type="date"
            value={query.from ?? ''}
            onChange={(event) => desk.search({ from: event.currentTarget.value })}
          />
        </label>
        <label>
          To day
          <input
            type="date"
            value={query.to ?? ''}
            onChange={(event) => desk.search({ to: event.currentTarget.value })}
          />
        </label>
        <label>
          Show
          <select
            value={query.state ?? 'any'}
            onChange={(event) => desk.search({ state: event.currentTarget.value as SessionState })}
          >
            {STATES.map(([name, words]) => (
              <option key={name} value={name}>
                {words}
              </option>
            ))}
          </select>
        </label>
      </form>
    </search>
  );
}
