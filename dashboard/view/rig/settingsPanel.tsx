import type { RigTold } from '../../../server/web/rig/rigMessages.js';
import { ScrollBox } from '../animals/scrollBox.js';

/** Every setting of the rig file beside what it means; the file itself is edited, not this page. */
export function SettingsPanel({ rig }: { rig: RigTold }) {
  const sections = [...new Set(rig.settings.map(({ path }) => path[0]!))];
  return (
    <section class="panel settings-panel" aria-labelledby="settings-title">
      <h2 id="settings-title">Settings</h2>
      <p class="soft">
        From {rig.path}. Change the file, and start Lapwing again; <code>lapwing check</code> says
        what is wrong with it.
      </p>
      {sections.map((section) => {
        const all = rig.settings.filter(({ path }) => path[0] === section);
        return (
          <details key={section} open={section === 'belt'}>
            <summary>
              {section.replaceAll('_', ' ')}{' '}
              <span class="soft">
                {all.filter(({ value }) => value !== null).length} of {all.length} said
              </span>
            </summary>
            <ScrollBox label={`Settings of ${section}`}>
              <table>
                <thead>
                  <tr>
                    <th scope="col">Setting</th>
                    <th scope="col">Value</th>
                    <th scope="col">Meaning; what holds where nothing is said</th>
                  </tr>
                </thead>
                <tbody>
                  {all.map(({ path, value, meaning }) => (
                    <tr key={path.join('.')} class={value === null ? 'unsaid' : ''}>
                      <th scope="row">{path.slice(path.length > 1 ? 1 : 0).join(' · ')}</th>
                      <td>{value ?? '–'}</td>
                      <td>{meaning}</td>
                    </tr>
                  ))}
                </tbody>
              </table>
            </ScrollBox>
          </details>
        );
      })}
    </section>
  );
}
