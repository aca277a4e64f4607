import type { ComponentChildren } from 'preact';
import type { SessionTold } from '../../../server/web/records/recordsMessages.js';
import { bytesWords, fixed } from '../../model/format.js';
import {
  canMend,
  checkWords,
  momentWords,
  type Records,
  standing,
  waterWords,
} from '../../model/records.js';
import { LevelShape } from '../shapes.js';
import { ExportsPanel } from './exportsPanel.js';
import { JobLine } from './jobLine.js';
import { OtherRulesPanel } from './otherRulesPanel.js';
import type { RecordsDesk } from './recordsDesk.js';
import { ReplayPanel } from './replayPanel.js';
import { ReportPanel } from './reportPanel.js';
import { SummaryPanel } from './summaryPanel.js';

export interface SessionProps {
  readonly desk: RecordsDesk;
  readonly state: Records;
  readonly session: SessionTold;
}

/** The session that is open, and all that can be done with it. */
export function SessionPanel({ desk, state }: { desk: RecordsDesk; state: Records }) {
  const { open, session } = state;
  if (open === undefined) {
    return <p class="empty choose">Choose a session to see what happened in it.</p>;
  }
  if (!session) {
    return (
      <section class="panel">
        <BackLink />
        <p class="empty">{open} is being read.</p>
      </section>
    );
  }
  const props = { desk, state, session };
  const readable = session.row.bad === null && !session.row.recording;
  return (
    <>
      <FactsPanel {...props} />
      {readable ? (
        <>
          <SummaryPanel {...props} />
          <ReportPanel {...props} />
          <ReplayPanel {...props} />
          <OtherRulesPanel {...props} />
        </>
      ) : null}
      {session.row.recording ? null : <ExportsPanel {...props} readable={readable} />}
    </>
  );
}

function BackLink() {
  return (
    <a class="back-link" href="#records">
      ‹ All sessions
    </a>
  );
}

function FactsPanel({ desk, state, session }: SessionProps) {
  const { row, description, recordBytes } = session;
  const { level, words } = standing(row);
  const missing = description?.record?.missing ?? [];
  const job = state.jobs.get('mend');
  return (
    <section class="panel facts-panel" aria-labelledby="session-title">
      <BackLink />
      <h2 id="session-title">
        {row.subject ? <span class="subject">{row.subject}</span> : null} {row.title || row.name}{' '}
        {row.simulated ? <span class="tag">simulated</span> : null}
      </h2>
      {row.bad === null ? null : (
        <p class="problem">
          Its description cannot be read: {row.bad}. The record does not depend on it.
        </p>
      )}
      {row.recording ? (
        <p class="empty">It is being recorded now. What happened is told when it has ended.</p>
      ) : null}
      <dl class="facts">
        <Fact name="Started">{momentWords(row.startedAt)}</Fact>
        <Fact name="Ended">{endWords(session)}</Fact>
        <Fact name="Length">{row.minutes === null ? '–' : `${fixed(row.minutes, 1)} min`}</Fact>
        <Fact name="Water">
          {waterWords(row.givenUl, row.uncertainUl)} µL
          {description?.waterEarlierUl ? (
            <span class="soft">
              {' '}
              after {fixed(description.waterEarlierUl, 1)} µL earlier that day
            </span>
          ) : null}
        </Fact>
        <Fact name="Experimenter">{row.experimenter}</Fact>
        <Fact name="Protocol">{row.protocolNumber}</Fact>
        <Fact name="Session">
          {row.sessionNumber === null ? null : `number ${row.sessionNumber}`}
        </Fact>
        <Fact name="Rules file">{row.rules}</Fact>
        <Fact name="Seed">{description?.seed}</Fact>
        <Fact name="Board">{description?.board?.model}</Fact>
        <Fact name="Record">
          <LevelShape level={level} /> {words}, {bytesWords(recordBytes)}
        </Fact>
        <Fact name="Self-check" across>
          {row.bad === null ? checkWords(session) : null}
        </Fact>
        <Fact name="Folder" across>
          {row.name}
        </Fact>
      </dl>
      {missing.length > 0 ? (
        <ul class="missing">
          {missing.map((sentence) => (
            <li key={sentence}>{sentence}</li>
          ))}
        </ul>
      ) : null}
      {canMend(row) ? (
        <div class="mending">
          <p class="caution">
            This record was not closed. If the session is to go on, resume it on its rig instead (
            <code>lapwing resume</code>): what is mended here has ended.
          </p>
          <button
            type="button"
            disabled={job?.state === 'running' || job?.state === 'waiting'}
            onClick={() => void desk.work({ do: 'mend' })}
          >
            Mend the record
          </button>
        </div>
      ) : null}
      <JobLine desk={desk} job={job} what="Mending" />
    </section>
  );
}

function Fact(props: { name: string; across?: boolean; children: ComponentChildren }) {
  const { name, across, children } = props;
  return (
    <div class={`fact ${across ? 'across' : ''}`}>
      <dt>{name}</dt>
      <dd>{children || '–'}</dd>
    </div>
  );
}

function endWords({ row }: SessionTold): string {
  if (row.ended === null) return row.recording ? 'it runs' : 'not ended';
  const { how, at, reason } = row.ended;
  return `${momentWords(at)}, ${HOW[how]}${reason ? `: ${reason}` : ''}`;
}
const HOW = {
  rules: 'by the rules',
  operator: 'by hand',
  signal: 'with the program',
  error: 'by an error',
  mended: 'mended later',
} as const;
