import type { CalibrationRow, RigTold } from '../../../server/web/rig/rigMessages.js';
import { fixed } from '../../model/format.js';
import type { RigDesk } from './rigDesk.js';

/** What was measured, how old it is, how well it is known, and what is in force. */
export function CalibrationsPanel(props: { desk: RigDesk; rig: RigTold; running: boolean }) {
  const { desk, rig, running } = props;
  return (
    <section class="panel calibrations-panel" aria-labelledby="calibrations-title">
      <h2 id="calibrations-title">Calibrations</h2>
      {rig.calibrations.length === 0 ? (
        <p class="empty">
          Nothing is stored yet: the rig file has its numbers written out, and nobody knows their
          age.
        </p>
      ) : (
        <ul class="calibrations">
          {rig.calibrations.map((row) => (
            <Row key={row.name} row={row} desk={desk} running={running} />
          ))}
        </ul>
      )}
      {rig.bad.map(({ file, why }) => (
        <p key={file} class="trouble">
          {file} is no calibration: {why}
        </p>
      ))}
    </section>
  );
}

function Row({ row, desk, running }: { row: CalibrationRow; desk: RigDesk; running: boolean }) {
  const { name, kind, of, ageDays, old, warnAfterDays, inForce, board, values } = row;
  const usable = kind === 'belt' || kind === 'valve' || kind === 'lick';
  const alarm = values.verdict === 'alarm';
  return (
    <li class={old || alarm ? 'old' : ''}>
      <div>
        <b>{name}</b>{' '}
        <span class="soft">
          {kind} of {of}, {ageWords(ageDays)}
        </span>{' '}
        {inForce ? <span class="tag in-force">in force</span> : null}
        {board.simulated ? <span class="tag">simulated rig</span> : null}
        {old ? <p class="look">Older than {warnAfterDays} days: measure again.</p> : null}
        {alarm ? <p class="look">More than 10 % off: calibrate before the next animal.</p> : null}
        <details>
          <summary>Values</summary>
          <dl class="values">
            {Object.entries(values).map(([key, value]) => (
              <div key={key}>
                <dt>{key}</dt>
                <dd>
                  {typeof value === 'number' ? short(value) : value}
                  {row.uncertainty[key] === undefined ? '' : ` ± ${short(row.uncertainty[key])}`}
                </dd>
              </div>
            ))}
          </dl>
          <p class="soft">
            {row.method}. By {row.by || 'nobody named'}. ± is one standard uncertainty.
          </p>
        </details>
      </div>
      {usable && !inForce ? (
        <button type="button" disabled={running} onClick={() => void desk.use(name)}>
          Put in force<span class="unseen"> {name}</span>
        </button>
      ) : null}
    </li>
  );
}

function ageWords(days: number): string {
  if (days < 1) return 'today';
  return days < 2 ? 'a day old' : `${Math.floor(days)} days old`;
}

function short(value: number): string {
  if (value === 0 || Math.abs(value) >= 1_000) return fixed(value, 0);
  return fixed(value, Math.abs(value) >= 10 ? 2 : 3);
}
