import type { Live } from '../../model/live.js';
import type { Theme } from '../actions.js';
import { BoardPanel } from './boardPanel.js';
import { CalibrationsPanel } from './calibrationsPanel.js';
import { ChecksList } from './checksList.js';
import { GuidePanel } from './guidePanel.js';
import type { RigDesk } from './rigDesk.js';
import { SettingsPanel } from './settingsPanel.js';
import { StripPanel } from './stripPanel.js';
import { TryPanel } from './tryPanel.js';

/** The rig itself: what it senses and does now, how well it is known, and whether it is ready. */
export function RigPage({ desk, live, theme }: { desk: RigDesk; live: Live; theme: Theme }) {
  const { rig, guide } = desk;
  const running = live.state?.session === 'running';
  const busy = guide.state === 'going' || guide.state === 'asking';
  if (rig === undefined) {
    return (
      <main class="rig" aria-label="Rig">
        <p class="loading">{desk.notice?.text ?? 'Asking for the rig.'}</p>
      </main>
    );
  }
  return (
    <main class="rig" aria-label="Rig">
      <Said desk={desk} />
      <div class="sensing">
        <StripPanel desk={desk} rig={rig} live={live} theme={theme} />
        <TryPanel desk={desk} rig={rig} running={running} busy={busy} />
        <BoardPanel desk={desk} live={live} />
      </div>
      <div class="measuring">
        <GuidePanel desk={desk} rig={rig} running={running} />
        <LastPreflight desk={desk} />
        <CalibrationsPanel desk={desk} rig={rig} running={running} />
      </div>
      <SettingsPanel rig={rig} />
    </main>
  );
}

function LastPreflight({ desk }: { desk: RigDesk }) {
  const preflight = desk.rig?.preflight;
  if (preflight === null || preflight === undefined) return null;
  const at = new Date(preflight.madeAt).toLocaleTimeString([], {
    hour: '2-digit',
    minute: '2-digit',
  });
  return (
    <section class="panel" aria-labelledby="preflight-title">
      <h2 id="preflight-title">
        Last pre-flight: {preflight.passed ? 'ready' : 'not ready'}, at {at}
      </h2>
      <details>
        <summary>What was found</summary>
        <ChecksList checks={preflight.checks} />
      </details>
    </section>
  );
}

function Said({ desk }: { desk: RigDesk }) {
  const { notice } = desk;
  return (
    <div class="said" role="status">
      {notice === undefined ? null : (
        <div class={`banner ${notice.kind}`}>
          <div>
            <strong>{notice.text}</strong>
            {notice.remedy === '' ? null : <p>{notice.remedy}</p>}
          </div>
          <button type="button" onClick={() => desk.dismiss()}>
            Close
          </button>
        </div>
      )}
    </div>
  );
}
