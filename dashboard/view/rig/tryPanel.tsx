import { useState } from 'preact/hooks';
import type { RigTold } from '../../../server/web/rig/rigMessages.js';
import { HoldButton } from '../holdButton.js';
import { LONG_PRESS_MS } from '../keys.js';
import type { RigDesk } from './rigDesk.js';

const USUAL_MS = { valve: 50, stimulus: 20, mark: 10 } as const;

/** Outputs one pulse at a time, through the guards; stimuli and water want a long press. */
export function TryPanel(props: { desk: RigDesk; rig: RigTold; running: boolean; busy: boolean }) {
  const { desk, rig, running, busy } = props;
  const [into, setInto] = useState<'vial' | 'spout'>('vial');
  return (
    <section class="panel try-panel" aria-labelledby="try-title">
      <h2 id="try-title">Try outputs</h2>
      {running ? (
        <p class="empty">While a session runs, only its rules drive outputs. End it first.</p>
      ) : (
        <>
          <p class="caution">
            Light, current and water act on whoever is near: no animal on the rig, nobody in the
            beam, eye protection as the local rules ask. The limits of the rig file hold here too.
          </p>
          {rig.outputs.map((output) => (
            <TryRow
              key={output.name}
              output={output}
              disabled={busy}
              onTry={(ms) => void desk.attempt(output.name, ms, into)}
            />
          ))}
          <label class="into">
            Water goes into
            <select
              value={into}
              onChange={(event) => setInto(event.currentTarget.value as 'vial' | 'spout')}
            >
              <option value="vial">a vial: no limit of an animal's water</option>
              <option value="spout">the spout, within the session's limit</option>
            </select>
          </label>
        </>
      )}
    </section>
  );
}

function TryRow(props: {
  output: RigTold['outputs'][number];
  disabled: boolean;
  onTry: (ms: number) => void;
}) {
  const { output, disabled, onTry } = props;
  const { name, kind, longestOnUs } = output;
  const mostMs = longestOnUs / 1_000;
  const [ms, setMs] = useState(Math.min(mostMs, USUAL_MS[kind]));
  const id = `try-${name}`;
  const good = ms > 0 && ms <= mostMs;
  return (
    <div class={`try-row ${kind}`}>
      <label for={id}>
        <b>{name}</b> <span class="tag">{kind}</span>
      </label>
      <input
        id={id}
        type="number"
        min={0.1}
        max={mostMs}
        step="any"
        value={ms}
        aria-invalid={!good}
        aria-describedby={`${id}-unit`}
        onInput={(event) => setMs(event.currentTarget.valueAsNumber)}
      />
      <span id={`${id}-unit`} class="soft">
        ms, at most {mostMs}
      </span>
      <HoldButton
        holdMs={kind === 'mark' ? 0 : LONG_PRESS_MS}
        disabled={disabled || !good}
        onFire={() => onTry(ms)}
      >
        {kind === 'mark' ? 'Pulse' : 'Hold to pulse'}
        <span class="unseen"> {name}</span>
      </HoldButton>
    </div>
  );
}
