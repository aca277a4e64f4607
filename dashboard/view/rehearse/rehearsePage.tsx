import type { Rehearse } from '../../model/rehearse.js';
import type { Theme } from '../actions.js';
import { BeltRows } from './beltRows.js';
import type { Desk } from './desk.js';
import { EditorPanel } from './editorPanel.js';
import { ProblemsPanel } from './problemsPanel.js';
import { RehearsalPanel } from './rehearsalPanel.js';

/** Edit a rules file with its belt beside it, and rehearse it in place. */
export function RehearsePage({ desk, theme }: { desk: Desk; theme: Theme }) {
  const state: Rehearse = desk.state;
  return (
    <main class="rehearse" aria-label="Rehearse">
      <div class="writing">
        <EditorPanel desk={desk} state={state} />
        <ProblemsPanel desk={desk} state={state} />
      </div>
      <div class="showing">
        <BeltRows desk={desk} state={state} />
        <RehearsalPanel desk={desk} state={state} theme={theme} />
        {state.check?.explain ? (
          <section class="panel" aria-labelledby="explain-title">
            <h2 id="explain-title">In plain words</h2>
            <details>
              <summary>What this file will do, and the most it can deliver</summary>
              <pre class="explain">{state.check.explain}</pre>
            </details>
          </section>
        ) : null}
      </div>
    </main>
  );
}
