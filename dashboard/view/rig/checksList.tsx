import type { CheckedItem, CheckResult } from '../../../server/session/preflight.js';
import type { Level } from '../../model/health.js';
import { LevelShape } from '../shapes.js';

const LEVELS: Readonly<Record<CheckResult, Level>> = {
  passed: 'good',
  failed: 'bad',
  overridden: 'warn',
  'not possible': 'off',
};

/** What a pre-flight found, one line a check, with what to do where it failed. */
export function ChecksList({ checks }: { checks: readonly CheckedItem[] }) {
  return (
    <ul class="checks">
      {checks.map(({ id, title, result, detail, remedy, reason }) => (
        <li key={id} class={result.replace(' ', '-')}>
          <LevelShape level={LEVELS[result]} />
          <div>
            <b>{title}</b>: <span class="verdict">{result}</span>
            <p>{detail}</p>
            {result === 'passed' || remedy === '' ? null : <p class="remedy">{remedy}</p>}
            {reason === undefined ? null : <p>Overridden: {reason}</p>}
          </div>
        </li>
      ))}
    </ul>
  );
}
