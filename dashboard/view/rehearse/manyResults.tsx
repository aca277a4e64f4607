import type {
  DrawReport,
  Hindrance,
  PhaseReport,
  RuleReport,
  RunsReport,
  Spread,
} from '../../../server/rehearse/runsReport.js';
import type { ManyResult } from '../../../server/web/rules/rulesMessages.js';
import type { Rehearse } from '../../model/rehearse.js';
import { ShareBar, SpreadPlot, spreadWords } from './spreadPlot.js';

const MOST_WHY = 4;

/** How many sessions of the file differ. */
export function ManyResults({ state, result }: { state: Rehearse; result: ManyResult }) {
  const { report, tookS } = result;
  const old = state.rehearsedText !== '' && state.rehearsedText !== state.text;
  return (
    <div class="result many">
      <p role="status">
        <strong>{report.runs} sessions.</strong> Middle value, and in brackets what nine in ten
        sessions lie between.{' '}
        <span class="soft">
          Seed {report.seed}; animal {report.animal}; took {tookS.toFixed(1)} s.
        </span>
      </p>
      {old ? <p class="old">The text has changed since this rehearsal.</p> : null}
      <Whole report={report} />
      <Rules report={report} />
      <Phases report={report} />
      <Draws draws={report.draws} />
      <Ends report={report} />
      <details>
        <summary>What to know when reading this</summary>
        <ul class="notes">
          <li>Latency of what the host decides: {report.latency}.</li>
          {report.notes.map((note) => (
            <li key={note}>{note}</li>
          ))}
        </ul>
      </details>
    </div>
  );
}

function Row({ name, spread, decimals }: { name: string; spread: Spread; decimals?: number }) {
  return (
    <tr>
      <th scope="row">{name}</th>
      <td class="spread-cell">
        <SpreadPlot spread={spread} />
      </td>
      <td>{spreadWords(spread, decimals)}</td>
    </tr>
  );
}

function Whole({ report }: { report: RunsReport }) {
  const { minutes, laps, licks, waterUl, lickShare } = report;
  return (
    <table>
      <thead>
        <tr>
          <th scope="col">Session</th>
          <th scope="col">
            <span class="unseen">spread over sessions</span>
          </th>
          <th scope="col">middle</th>
        </tr>
      </thead>
      <tbody>
        <Row name="length, min" spread={minutes} decimals={1} />
        <Row name="laps" spread={laps} />
        <Row name="licks" spread={licks} />
        <Row name="water, uL" spread={waterUl} decimals={1} />
        {lickShare ? <Row name="licks near spout, %" spread={percents(lickShare)} /> : null}
      </tbody>
    </table>
  );
}

function Rules({ report }: { report: RunsReport }) {
  return (
    <table>
      <thead>
        <tr>
          <th scope="col">Rule</th>
          <th scope="col">
            <span class="unseen">spread over sessions</span>
          </th>
          <th scope="col">fired</th>
        </tr>
      </thead>
      <tbody>
        {report.rules.map((rule) => (
          <RuleRows key={rule.name} rule={rule} runs={report.runs} />
        ))}
      </tbody>
    </table>
  );
}

function RuleRows({ rule, runs }: { rule: RuleReport; runs: number }) {
  const { name, when, fired, shams, byPhase, runsFired, moments, why, boardMm, hostMm } = rule;
  const inPhases = byPhase.filter(({ fired: inPhase }) => inPhase.most > 0);
  return (
    <tr>
      <th scope="row">
        {name}
        {runsFired === 0 ? (
          <span class="why never">
            {moments === 0
              ? `its moment never came: ${when}`
              : `never fired, asked ${moments} times`}
          </span>
        ) : null}
        {runsFired > 0 && runsFired < runs ? (
          <span class="why">
            fired in {runsFired} of {runs} sessions
          </span>
        ) : null}
        {inPhases.length > 0 ? (
          <span class="why">
            {inPhases
              .map(({ phase, fired: inPhase }) => `${phase} ${spreadWords(inPhase)}`)
              .join('; ')}
          </span>
        ) : null}
        {why.slice(0, MOST_WHY).map((hindrance) => (
          <span key={hindrance.kind + hindrance.words} class="why">
            {whyWords(hindrance)}
            <ShareBar share={hindrance.runs / runs} />
            {hindrance.runs} of {runs} sessions
          </span>
        ))}
        {boardMm ? <span class="why">off the place, by the board: {offWords(boardMm)}</span> : null}
        {hostMm ? <span class="why">off the place, by the host: {offWords(hostMm)}</span> : null}
      </th>
      <td class="spread-cell">
        <SpreadPlot spread={fired} />
      </td>
      <td>
        {spreadWords(fired)}
        {shams.most > 0 ? <span class="why">sham {spreadWords(shams)}</span> : null}
      </td>
    </tr>
  );
}

function Phases({ report }: { report: RunsReport }) {
  if (report.phases.length === 0) return null;
  return (
    <table>
      <thead>
        <tr>
          <th scope="col">Phase</th>
          <th scope="col">
            <span class="unseen">spread over sessions</span>
          </th>
          <th scope="col">minutes</th>
        </tr>
      </thead>
      <tbody>
        {report.phases.map((phase) => (
          <tr key={phase.name}>
            <th scope="row">
              {phase.name}
              <span class="why">{phaseWords(phase, report.runs)}</span>
            </th>
            <td class="spread-cell">
              {phase.minutes ? <SpreadPlot spread={phase.minutes} /> : null}
            </td>
            <td>{phase.minutes ? spreadWords(phase.minutes, 1) : 'never'}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

function Draws({ draws }: { draws: readonly DrawReport[] }) {
  if (draws.length === 0) return null;
  return (
    <table>
      <thead>
        <tr>
          <th scope="col">Draw</th>
          <th scope="col">
            <span class="unseen">share of draws</span>
          </th>
          <th scope="col">share in a session, %</th>
        </tr>
      </thead>
      <tbody>
        {draws.flatMap(({ name, values }) =>
          values.map(({ value, times, share, perRun }) => (
            <tr key={`${name} ${value}`}>
              <th scope="row">
                {name}: {value}
                <span class="why">{times} times</span>
              </th>
              <td class="spread-cell">
                <ShareBar share={share} />
              </td>
              <td>{spreadWords(percents(perRun))}</td>
            </tr>
          )),
        )}
      </tbody>
    </table>
  );
}

function Ends({ report }: { report: RunsReport }) {
  const { ends, endAlternatives, runs } = report;
  const rows = [
    ...ends.map(({ reason, runs: n }) => ({ words: reason, n })),
    ...(endAlternatives.length < 2 ? [] : endAlternatives).map(({ words, runs: n }) => ({
      ...{ words: `true at the end: ${words}`, n },
    })),
  ];
  return (
    <table>
      <thead>
        <tr>
          <th scope="col">Ended by</th>
          <th scope="col">
            <span class="unseen">share of sessions</span>
          </th>
          <th scope="col">sessions</th>
        </tr>
      </thead>
      <tbody>
        {rows.map(({ words, n }) => (
          <tr key={words}>
            <th scope="row">{words}</th>
            <td class="spread-cell">
              <ShareBar share={n / runs} />
            </td>
            <td>
              {n} of {runs}
            </td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

function whyWords({ kind, words, times, unknown }: Hindrance): string {
  const often = `${times} ${times === 1 ? 'time' : 'times'}`;
  const notKnown = unknown > 0 ? `, ${unknown} of them not known` : '';
  if (kind === 'if') return `${words} was not so, ${often}${notKnown}`;
  if (kind === 'limit') return `limit met: ${words}, ${often}`;
  return `${words}, ${often}`;
}

function phaseWords({ runsEntered, runsNotLeft }: PhaseReport, runs: number): string {
  if (runsEntered === 0) return 'never begun';
  const begun = `begun in ${runsEntered} of ${runs} sessions`;
  if (runsNotLeft === 0) return `${begun}, always left`;
  return `${begun}, ${runsNotLeft} ended in it`;
}

function offWords({ low, median, high }: Spread): string {
  return `${median.toFixed(2)} mm (${low.toFixed(2)} to ${high.toFixed(2)})`;
}

function percents(spread: Spread): Spread {
  const { least, low, median, high, most, bins } = spread;
  return {
    ...{ least: least * 100, low: low * 100, median: median * 100 },
    ...{ high: high * 100, most: most * 100, bins },
  };
}
