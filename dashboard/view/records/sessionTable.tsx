import type { SessionRow, SessionSort } from '../../../server/web/records/recordsMessages.js';
import { fixed, plural } from '../../model/format.js';
import {
  isNarrowed,
  momentWords,
  type Records,
  ROWS_AT_ONCE,
  sortedBy,
  standing,
  waterWords,
  whyNotComparable,
} from '../../model/records.js';
import { LevelShape } from '../shapes.js';
import type { RecordsDesk } from './recordsDesk.js';

interface Props {
  readonly desk: RecordsDesk;
  readonly state: Records;
}

const COLUMNS: readonly [SessionSort, string][] = [
  ['started', 'Started'],
  ['subject', 'Animal'],
  ['title', 'Title'],
  ['minutes', 'min'],
  ['water', 'µL'],
];

/** The sessions that fit, fifty at a time. */
export function SessionTable(props: Props) {
  const { desk, state } = props;
  const { list, query } = state;
  if (!list) return <p class="empty">The sessions are being listed.</p>;
  if (list.total === 0) {
    return (
      <p class="empty">
        There is no session yet. Each one that is begun on the Run page is kept in a folder of its
        own and shown here.
      </p>
    );
  }
  return (
    <>
      <p class="found" role="status">
        {isNarrowed(query)
          ? `${list.found} of ${plural(list.total, 'session')}`
          : plural(list.total, 'session')}
      </p>
      <CompareBar {...props} />
      <table class="sessions">
        <thead>
          <tr>
            <th scope="col">
              <span class="unseen">Compare</span>
            </th>
            {COLUMNS.map(([name, words]) => (
              <SortHead key={name} {...props} name={name} words={words} />
            ))}
            <th scope="col" class="standing">
              Record
            </th>
          </tr>
        </thead>
        <tbody>
          {list.rows.map((row) => (
            <Row key={row.name} {...props} row={row} />
          ))}
        </tbody>
      </table>
      <Pager desk={desk} offset={query.offset ?? 0} shown={list.rows.length} found={list.found} />
    </>
  );
}

function SortHead({ desk, state, name, words }: Props & { name: SessionSort; words: string }) {
  const { query } = state;
  const sorted = (query.sort ?? 'started') === name;
  const up = query.order === 'up';
  return (
    <th
      scope="col"
      class={`by-${name}`}
      aria-sort={sorted ? (up ? 'ascending' : 'descending') : 'none'}
    >
      <button type="button" onClick={() => desk.setQuery(sortedBy(query, name))}>
        {words}
        <span class="turn" aria-hidden="true">
          {sorted ? (up ? '▲' : '▼') : ''}
        </span>
      </button>
    </th>
  );
}

function Row({ desk, state, row }: Props & { row: SessionRow }) {
  const { level, words } = standing(row);
  const open = state.open === row.name;
  const comparable = row.bad === null && !row.recording;
  const title = row.bad === null ? row.title : row.name;
  return (
    <tr class={open ? 'current' : ''}>
      <td class="tick">
        {comparable ? (
          <input
            type="checkbox"
            aria-label={`Compare ${row.name}`}
            checked={state.ticked.has(row.name)}
            onChange={(event) => desk.tick(row, event.currentTarget.checked)}
          />
        ) : null}
      </td>
      <td class="started">{momentWords(row.startedAt)}</td>
      <td class="subject-cell">{row.subject}</td>
      <th scope="row" class="title-cell">
        <a
          href={`#records/${encodeURIComponent(row.name)}`}
          aria-current={open ? 'true' : undefined}
        >
          {title}
        </a>
        {row.bad === null ? null : <span class="why">{row.bad}</span>}
      </th>
      <td class="minutes">{fixed(row.minutes, 0)}</td>
      <td class="water">{waterWords(row.givenUl, row.uncertainUl)}</td>
      <td class="standing">
        <LevelShape level={level} /> {words}
      </td>
    </tr>
  );
}

function CompareBar({ desk, state }: Props) {
  const { ticked, query, list } = state;
  const why = whyNotComparable(ticked);
  const rows = (list?.rows ?? []).filter((row) => row.bad === null && !row.recording);
  return (
    <div class="compare-bar">
      <span class="soft">
        {ticked.size === 0
          ? 'Tick sessions of one animal to compare them.'
          : `${ticked.size} ticked`}
      </span>
      {query.subject ? (
        <button
          type="button"
          onClick={() => {
            for (const row of rows) desk.tick(row, true);
          }}
        >
          Tick those shown
        </button>
      ) : null}
      {ticked.size > 0 ? (
        <>
          <button type="button" onClick={() => desk.untickAll()}>
            Untick
          </button>
          <button
            type="button"
            class="primary"
            disabled={why !== undefined}
            title={why}
            onClick={() => void desk.compare()}
          >
            Compare
          </button>
          {why === undefined ? null : <span class="soft">{why}</span>}
        </>
      ) : null}
    </div>
  );
}

function Pager(props: { desk: RecordsDesk; offset: number; shown: number; found: number }) {
  const { desk, offset, shown, found } = props;
  if (found === 0) return <p class="empty">None fits.</p>;
  if (found <= ROWS_AT_ONCE) return null;
  return (
    <nav class="pager" aria-label="More sessions">
      <button type="button" disabled={offset === 0} onClick={() => desk.turn(-1)}>
        Back
      </button>
      <span role="status">
        {offset + 1} to {offset + shown} of {found}
      </span>
      <button type="button" disabled={offset + shown >= found} onClick={() => desk.turn(1)}>
        On
      </button>
    </nav>
  );
}
