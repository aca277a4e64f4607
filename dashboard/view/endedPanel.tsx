import { useEffect, useRef, useState } from 'preact/hooks';
import { recordsApi } from '../stream/recordsApi.js';
import { RecordsDesk } from './records/recordsDesk.js';
import { SummaryPanel } from './records/summaryPanel.js';

/** A record is closed and checked within seconds; a long one takes longer. */
const LOOK_MS = 2_000;

/** What the session that ended last came to, as its record says; the Records page has the rest. */
export function EndedPanel({ because }: { because: string }) {
  const [, touch] = useState(0);
  const desk = useRef<RecordsDesk>(undefined);
  desk.current ??= new RecordsDesk(() => touch((n) => n + 1));
  const { state } = desk.current;
  useEffect(() => {
    let timer: ReturnType<typeof setTimeout> | undefined;
    let gone = false;
    const look = async () => {
      const told = await recordsApi.list({ limit: 1 });
      if (gone || !told.done) return;
      const [row] = told.value.rows;
      if (row && !row.recording) desk.current!.shown(row.name);
      else timer = setTimeout(() => void look(), LOOK_MS);
    };
    void look();
    return () => {
      gone = true;
      clearTimeout(timer);
      desk.current!.hidden();
    };
  }, []);
  const { session, open } = state;
  return (
    <div class="ended-session">
      <p class="ended">The last session ended{because ? `: ${because}` : ''}.</p>
      {session && open !== undefined ? (
        <>
          <SummaryPanel desk={desk.current} state={state} session={session} />
          <a href={`#records/${encodeURIComponent(open)}`}>Its record, report and replay</a>
        </>
      ) : null}
    </div>
  );
}
