import { ageWords, type Freshness } from '../model/freshness.js';
import type { Live } from '../model/live.js';
import { stopAlarm } from '../model/stop.js';
import type { Actions } from './actions.js';
import { HandBanner } from './handOnBelt.js';
import { LevelShape } from './shapes.js';

/** What must not be overlooked: the stop's fate, staleness, and the answer to the last request. */
export function Banners(props: {
  live: Live;
  freshness: Freshness;
  nowMs: number;
  actions: Actions;
}) {
  return (
    <section class="banners" aria-label="Notices">
      <StopBanner {...props} />
      <HandBanner live={props.live} />
      <StaleBanner {...props} />
      <Notice {...props} />
    </section>
  );
}

function StopBanner({ live, nowMs, actions }: { live: Live; nowMs: number; actions: Actions }) {
  const { stop, state } = live;
  if (stop.is === 'idle') return null;
  if (stop.is === 'asking') {
    const alarm = stopAlarm(stop, nowMs);
    return (
      <div class={`banner ${alarm ? 'bad loud' : 'warn'}`} role="alert">
        <LevelShape level={alarm ? 'bad' : 'warn'} />
        <div>
          <strong>{alarm ? 'The stop is NOT confirmed' : 'Stopping everything'}</strong>
          <p>
            {alarm ? 'Use the manual switch at the rig now. ' : 'Waiting for the loop to confirm. '}
            {stop.trouble} {alarm ? `Trying again by itself (attempt ${stop.tries}).` : ''}
          </p>
        </div>
      </div>
    );
  }
  const on = (live.setup?.outputs ?? [])
    .filter((output, n) => output.kind !== 'mark' && ((state?.outputs ?? 0) >> n) & 1)
    .map((output) => output.name);
  return (
    <div class={`banner ${on.length > 0 ? 'bad' : 'good'}`} role="alert">
      <LevelShape level={on.length > 0 ? 'bad' : 'good'} />
      <div>
        <strong>Stopped: the loop confirmed at {stop.at}</strong>
        <p>
          {on.length > 0
            ? `Still reported on: ${on.join(', ')}. Use the manual switch at the rig.`
            : 'Outputs are idle. Stimulus and water stay held until they are released; the record goes on.'}
        </p>
      </div>
      <button type="button" onClick={actions.dismissStop}>
        Understood
      </button>
    </div>
  );
}

function StaleBanner({ live, freshness }: { live: Live; freshness: Freshness }) {
  if (freshness.fresh) return null;
  const never = Number.isNaN(freshness.ageMs);
  const { record } = live.state ?? {};
  return (
    <div class="banner warn stale-banner">
      <LevelShape level="warn" />
      <div>
        <strong role="alert">{freshness.why}</strong>
        <p>
          {never ? null : (
            <span class="stale-age">
              What you see is <b>{ageWords(freshness.ageMs)} old</b>
              {record?.state === 'writing' ? '; whether recording goes on is not known here' : ''}.{' '}
            </span>
          )}
          {freshness.remedy}
        </p>
      </div>
    </div>
  );
}

function Notice({ live, actions }: { live: Live; actions: Actions }) {
  const { notice } = live;
  return (
    <div role="status" class="notice-place">
      {notice ? (
        <div class={`banner ${notice.kind}`}>
          <LevelShape level={notice.kind} />
          <div>
            <strong>{notice.text}</strong>
            {notice.remedy === '' ? null : <p>{notice.remedy}</p>}
          </div>
          <button type="button" onClick={actions.dismissNotice}>
            Close
          </button>
        </div>
      ) : null}
    </div>
  );
}
