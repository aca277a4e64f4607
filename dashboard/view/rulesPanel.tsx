import type { Live } from '../model/live.js';
import { askedWords } from '../model/phase.js';
import { LevelShape } from './shapes.js';

/** How often each rule did what. */
export function RulesPanel({ live }: { live: Live }) {
  const rules = live.state?.rules ?? [];
  const lap = live.state?.lap ?? 0;
  if (rules.length === 0) return null;
  return (
    <section class="panel rules-panel" aria-labelledby="rules-title">
      <h2 id="rules-title">Rules</h2>
      <table>
        <thead>
          <tr>
            <th scope="col">Rule</th>
            <th scope="col">Fired</th>
            <th scope="col">Sham</th>
            <th scope="col">Withheld</th>
            <th scope="col">Missed</th>
          </tr>
        </thead>
        <tbody>
          {rules.map((rule) => (
            <tr key={rule.name}>
              <th scope="row">
                <span class={`armed ${rule.armed ? 'yes' : ''}`}>
                  <LevelShape level={rule.armed ? 'good' : 'off'} />
                  {rule.name}
                  <span class={rule.armed || rule.asked ? 'armed-word' : 'unseen'}>
                    {rule.armed ? 'armed' : 'not armed'}
                    {rule.asked ? `, ${askedWords(rule.asked, lap)}` : ''}
                  </span>
                </span>
              </th>
              <td>{rule.firings}</td>
              <td>{rule.shams}</td>
              <td class={rule.withheld > 0 ? 'some' : ''}>{rule.withheld}</td>
              <td class={rule.missed > 0 ? 'some' : ''}>{rule.missed}</td>
            </tr>
          ))}
        </tbody>
      </table>
    </section>
  );
}
