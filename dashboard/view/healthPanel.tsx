import { healthOf } from '../model/health.js';
import type { Live } from '../model/live.js';
import { LevelShape } from './shapes.js';

/** Each part's health as word, shape and colour, from this page down to the disk. */
export function HealthPanel({ live }: { live: Live }) {
  return (
    <section class="panel health-panel" aria-labelledby="health-title">
      <h2 id="health-title">Health</h2>
      <ul>
        {healthOf(live).map((line) => (
          <li key={line.what} class={line.level}>
            <LevelShape level={line.level} />
            <span class="what">{line.what}</span>
            <strong>{line.word}</strong>
            <span class="detail">
              {line.detail}
              {line.remedy === '' ? null : <em> {line.remedy}</em>}
            </span>
          </li>
        ))}
      </ul>
    </section>
  );
}
