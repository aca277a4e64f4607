import type { RulesProblem } from '../../../server/web/rules/rulesMessages.js';
import { countWords, type Rehearse } from '../../model/rehearse.js';
import type { Desk } from './desk.js';

/** Every problem at once, in the order of the text; choosing one goes there. */
export function ProblemsPanel({ desk, state }: { desk: Desk; state: Rehearse }) {
  const { check, checking } = state;
  const problems = check?.problems ?? [];
  return (
    <section class="panel problems-panel" aria-labelledby="problems-title">
      <h2 id="problems-title">
        Problems{' '}
        <span class={`count ${kindOf(problems)}`} role="status">
          {check ? countWords(problems) : 'not checked yet'}
        </span>
        {checking && check ? <span class="checking">checking</span> : null}
      </h2>
      {problems.length === 0 ? (
        <p class="empty">{check ? 'This file can be rehearsed and run.' : ''}</p>
      ) : (
        <ol class="problems">
          {problems.map((problem) => (
            <li key={`${problem.path} ${problem.from} ${problem.code}`}>
              <ProblemRow problem={problem} desk={desk} />
            </li>
          ))}
        </ol>
      )}
    </section>
  );
}

function ProblemRow({ problem, desk }: { problem: RulesProblem; desk: Desk }) {
  const { severity, message, expected, nearest, also, here, path, line, column, from } = problem;
  return (
    <button
      type="button"
      class={`problem-row ${severity}`}
      disabled={!here}
      onClick={() => {
        desk.goTo(from);
        desk.onFocus();
      }}
    >
      <span class="severity">{severity}</span>
      <span class="where-in">
        {here ? '' : `${path}:`}
        {line}:{column}
      </span>
      <span class="told">
        {message}
        {expected === undefined ? null : <span class="more">expected: {expected}</span>}
        {nearest === undefined ? null : <span class="more">nearest: {nearest}</span>}
        {also.map((one) => (
          <span key={`${one.path} ${one.from}`} class="more">
            {one.here ? `line ${one.line}` : `${one.path}:${one.line}`}: {one.note}
          </span>
        ))}
      </span>
    </button>
  );
}

function kindOf(problems: readonly RulesProblem[]): string {
  if (problems.some(({ severity }) => severity === 'error')) return 'bad';
  return problems.length > 0 ? 'warn' : 'good';
}
