import type { Snapshot } from '../../server/loop/protocol.js';
import { fixed } from '../model/format.js';
import type { Live } from '../model/live.js';
import { nextWords, progressWords } from '../model/phase.js';
import { LevelShape } from './shapes.js';

/** The figures to be read from across the room. */
export function Vitals({ live }: { live: Live }) {
  const { state, setup } = live;
  return (
    <section class="vitals" aria-label="Now">
      <dl>
        <div class="vital lap">
          <dt>Lap</dt>
          <dd>
            <b id="lap">{state ? state.lap : '–'}</b>
          </dd>
        </div>
        <PhaseVital live={live} />
        <div class="vital">
          <dt>Position</dt>
          <dd>
            <b>{fixed(state?.positionCm, 1)}</b> <span class="unit">cm</span>
            <TrustLine state={state} />
          </dd>
        </div>
        <div class="vital">
          <dt>Speed</dt>
          <dd>
            <b>{fixed(state?.speedCmPerS, 1)}</b> <span class="unit">cm/s</span>
          </dd>
        </div>
        <div class="vital">
          <dt>Licks</dt>
          <dd>
            <b>{state?.licks ?? '–'}</b>
            <span class={`lick-lamp ${state?.lickOn ? 'on' : ''}`}>
              {state?.lickOn ? 'contact' : ''}
            </span>
          </dd>
        </div>
        <WaterVital state={state} />
        <div class="vital outputs">
          <dt>Outputs</dt>
          <dd>
            <ul class="lines">
              {(setup?.outputs ?? []).map((output, n) => {
                const on = (((state?.outputs ?? 0) >> n) & 1) === 1;
                return (
                  <li key={output.name} class={`line ${output.kind} ${on ? 'on' : ''}`}>
                    {output.name} <span>{on ? 'on' : 'off'}</span>
                  </li>
                );
              })}
            </ul>
          </dd>
        </div>
      </dl>
    </section>
  );
}

function PhaseVital({ live }: { live: Live }) {
  const { state, setup } = live;
  const phases = setup?.session?.phases ?? [];
  const next = nextWords(state, setup);
  return (
    <div class="vital phase">
      <dt>Phase</dt>
      <dd>
        <b>{state?.phase ?? '–'}</b>
        {state?.phase ? (
          <span class="progress" title={state.progress?.what}>
            {progressWords(state) ?? `lap ${state.phaseLap} of it`}
          </span>
        ) : null}
        <span class="under next">{next === undefined ? '' : `next: ${next}`}</span>
        {phases.length > 1 ? (
          <ol class="phases">
            {phases.map((name) => (
              <li key={name} aria-current={name === state?.phase ? 'step' : undefined}>
                {name}
              </li>
            ))}
          </ol>
        ) : null}
      </dd>
    </div>
  );
}

function TrustLine({ state }: { state: Snapshot | undefined }) {
  if (!state) return null;
  const level = state.trust === 'trusted' ? 'good' : state.trust === 'doubtful' ? 'warn' : 'off';
  return (
    <span class={`under trust-${state.trust}`}>
      <LevelShape level={level} />
      <span>
        <strong>{state.trust}</strong> {state.trustReason}
      </span>
    </span>
  );
}

function WaterVital({ state }: { state: Snapshot | undefined }) {
  const given = state?.waterUl ?? 0;
  const unsure = state?.waterUncertainUl ?? 0;
  const limit = state?.waterLimitUl ?? 0;
  const left = Math.max(0, limit - given - unsure);
  return (
    <div class="vital water">
      <dt>Water</dt>
      <dd>
        <b id="water">{state ? fixed(given, 1) : '–'}</b>{' '}
        <span class="unit">{unsure > 0 ? `to ${fixed(given + unsure, 1)} µL` : 'µL'}</span>
        {state ? (
          <span class="under">
            <Gauge given={given} unsure={unsure} limit={limit} label="Water this session" />
            <span>{fixed(left, 0)} µL left in this session</span>
            <Gauge
              given={state.waterTodayUl}
              unsure={unsure}
              limit={state.waterDayLimitUl}
              label="Water today"
            />
            <span>
              {fixed(Math.max(0, state.waterDayLimitUl - state.waterTodayUl - unsure), 0)} µL left
              today
            </span>
          </span>
        ) : null}
      </dd>
    </div>
  );
}

/** Given as a full bar, what may have been given besides as a hatched one. */
function Gauge(props: { given: number; unsure: number; limit: number; label: string }) {
  const { given, unsure, limit, label } = props;
  const share = (ul: number) => (limit > 0 ? Math.min(100, (ul / limit) * 100) : 0);
  return (
    <svg
      class="gauge"
      viewBox="0 0 100 6"
      preserveAspectRatio="none"
      role="img"
      aria-label={`${label}: ${fixed(given, 1)} of ${fixed(limit, 0)} µL`}
    >
      <rect class="all" width="100" height="6" />
      <rect class="unsure" width={share(given + unsure)} height="6" />
      <rect class="given" width={share(given)} height="6" />
    </svg>
  );
}
