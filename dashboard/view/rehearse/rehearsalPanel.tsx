import { useEffect, useRef } from 'preact/hooks';
import type { RehearsalResult } from '../../../server/web/rules/rulesMessages.js';
import { drawBelt } from '../../draw/belt.js';
import { readPalette } from '../../draw/palette.js';
import { drawRaster } from '../../draw/raster.js';
import { Surface } from '../../draw/surface.js';
import { LAPS_KEPT, LapStore } from '../../model/laps.js';
import { lapsInto, lastLap, minutesWords, placesOf, type Rehearse } from '../../model/rehearse.js';
import type { Theme } from '../actions.js';
import { Legend } from '../beltPanel.js';
import { RuleCounts } from '../ruleCounts.js';
import type { Desk } from './desk.js';
import { ManyResults } from './manyResults.js';

interface Props {
  readonly desk: Desk;
  readonly state: Rehearse;
  readonly theme: Theme;
}

/** How to rehearse, how far it is, and what came of it. */
export function RehearsalPanel(props: Props) {
  const { desk, state } = props;
  const { rehearsal, form } = state;
  const running = rehearsal.state === 'running';
  const set = (change: Partial<typeof form>) => {
    Object.assign(form, change);
    desk.refresh();
  };
  return (
    <section class="panel rehearsal-panel" aria-labelledby="rehearsal-title">
      <h2 id="rehearsal-title">Rehearse on the simulated rig</h2>
      <form
        onSubmit={(event) => {
          event.preventDefault();
          void desk.rehearse();
        }}
      >
        <label>
          Seed of the draws
          <input
            value={form.seed}
            maxLength={64}
            placeholder="a new one"
            onInput={(event) => set({ seed: event.currentTarget.value })}
          />
        </label>
        <label>
          Sessions
          <input
            type="number"
            min={1}
            max={1000}
            required
            value={form.runs}
            onInput={(event) => set({ runs: event.currentTarget.valueAsNumber })}
          />
        </label>
        <label>
          Animal
          <input
            type="number"
            min={0}
            max={2147483647}
            required
            value={form.animalSeed}
            disabled={form.runs > 1}
            title={form.runs > 1 ? 'Each session has another one' : undefined}
            onInput={(event) => set({ animalSeed: event.currentTarget.valueAsNumber })}
          />
        </label>
        <label>
          At most, minutes
          <input
            type="number"
            min={1}
            max={240}
            required
            value={form.minutes}
            onInput={(event) => set({ minutes: event.currentTarget.valueAsNumber })}
          />
        </label>
        <label class="trained">
          <input
            type="checkbox"
            checked={form.trained}
            onChange={(event) => set({ trained: event.currentTarget.checked })}
          />
          Trained
        </label>
        {running ? (
          <button type="button" onClick={() => void desk.cancel()}>
            Cancel
          </button>
        ) : (
          <button type="submit" class="primary" disabled={state.check?.right === false}>
            Rehearse
          </button>
        )}
      </form>
      <Outcome {...props} />
    </section>
  );
}

function Outcome(props: Props) {
  const { rehearsal, check } = props.state;
  switch (rehearsal.state) {
    case 'none':
      return (
        <p class="empty">
          {check?.right === false
            ? 'A file with errors cannot be rehearsed.'
            : 'A whole session runs in seconds, with the code of a live one and no board. Ask for many, and see how they differ.'}
        </p>
      );
    case 'running': {
      const { sessionS, mostS, runs, runsDone } = rehearsal;
      if (runs > 1) {
        return (
          <p class="progress" role="status">
            <progress max={runs} value={runsDone} aria-label="Sessions rehearsed" />
            {runsDone} of {runs} sessions
          </p>
        );
      }
      return (
        <p class="progress" role="status">
          <progress max={mostS} value={sessionS} aria-label="Session rehearsed" />
          {minutesWords(sessionS)} of at most {minutesWords(mostS)}
        </p>
      );
    }
    case 'cancelled':
      return (
        <p class="empty" role="status">
          Cancelled.
        </p>
      );
    case 'failed':
      return (
        <div class="failed" role="status">
          <p>The rehearsal failed.</p>
          <pre>{rehearsal.detail}</pre>
          <p>{rehearsal.remedy}</p>
        </div>
      );
    case 'many done':
      return <ManyResults {...props} result={rehearsal.result} />;
    case 'done':
      return <Result {...props} result={rehearsal.result} />;
  }
}

function Result({ state, desk, theme, result }: Props & { result: RehearsalResult }) {
  const last = lastLap(result);
  const top = Math.min(state.topLap ?? last, last);
  const old = state.rehearsedText !== '' && state.rehearsedText !== state.text;
  const { laps, licks, waterUl, sessionS, endedBecause, seed, tookS } = result;
  return (
    <div class="result">
      <p role="status">
        <strong>
          {laps} laps in {minutesWords(sessionS)}, {licks} licks, {waterUl.toFixed(1)} uL of water.
        </strong>{' '}
        Ended: {endedBecause}.{' '}
        <span class="soft">
          Seed {seed}; took {tookS.toFixed(1)} s.
        </span>
      </p>
      {old ? <p class="old">The text has changed since this rehearsal.</p> : null}
      <table>
        <thead>
          <tr>
            <th scope="col">Rule</th>
            <th scope="col">fired</th>
            <th scope="col">sham</th>
            <th scope="col">not</th>
            <th scope="col">off the place, mm</th>
          </tr>
        </thead>
        <tbody>
          {result.rules.map((rule) => (
            <tr key={rule.name}>
              <RuleCounts rule={rule} />
              <td>{errorWords(rule.medianErrorMm, rule.worstErrorMm)}</td>
            </tr>
          ))}
        </tbody>
      </table>
      <Legend />
      <Picture state={state} theme={theme} result={result} top={top} />
      {last > LAPS_KEPT - 1 ? (
        <label class="laps-shown">
          Laps {Math.max(0, top - LAPS_KEPT + 1)} to {top} of {last}
          <input
            type="range"
            min={LAPS_KEPT - 1}
            max={last}
            value={top}
            onInput={(event) => {
              state.topLap = event.currentTarget.valueAsNumber;
              desk.refresh();
            }}
          />
        </label>
      ) : null}
    </div>
  );
}

function errorWords(median: number | null, worst: number | null): string {
  if (median === null || worst === null) return '';
  return `${median.toFixed(1)} (most ${worst.toFixed(1)})`;
}

/** Belt and laps of the result over one x axis, with the drawings that the Run page has. */
function Picture(props: { state: Rehearse; theme: Theme; result: RehearsalResult; top: number }) {
  const { state, result, top, theme } = props;
  const belt = useRef<HTMLCanvasElement>(null);
  const raster = useRef<HTMLCanvasElement>(null);
  const draw = useRef(() => {});
  const made = useRef<{ belt: Surface; raster: Surface; store: LapStore } | undefined>(undefined);
  useEffect(() => {
    const again = () => draw.current();
    const surfaces = {
      belt: new Surface(belt.current!, again),
      raster: new Surface(raster.current!, again),
    };
    made.current = { ...surfaces, store: new LapStore() };
    return () => {
      surfaces.belt.release();
      surfaces.raster.release();
    };
  }, []);
  const places = placesOf(state.check?.outline);
  // The key stands for the places.
  const key = JSON.stringify(places);
  useEffect(() => {
    const { store, ...surfaces } = made.current!;
    lapsInto(store, result, top);
    draw.current = () => {
      const palette = readPalette();
      drawBelt(surfaces.belt, palette, result.beltCm, places);
      drawRaster(surfaces.raster, palette, result.beltCm, store, places);
    };
    draw.current();
  }, [result, top, theme, key]);
  return (
    <div
      role="img"
      aria-label={`Licks and firings by position, laps up to ${top}; the table has the numbers.`}
    >
      <div class="stack strip">
        <canvas ref={belt} />
      </div>
      <div class="stack raster">
        <canvas ref={raster} />
      </div>
    </div>
  );
}
