import type { ComponentChild } from 'preact';
import type { Charts } from '../draw/charts.js';
import { hasControls } from '../model/access.js';
import { freshness } from '../model/freshness.js';
import type { Live } from '../model/live.js';
import type { Actions, Theme } from './actions.js';
import { AlarmsPanel } from './alarmsPanel.js';
import { Banners } from './banners.js';
import { BeltPanel, SpeedPanel } from './beltPanel.js';
import { BrowserPanel } from './browserPanel.js';
import type { BrowserSettings } from './browserSettings.js';
import { ControlsBar } from './controlsBar.js';
import { ErrorsPanel } from './errorsPanel.js';
import { EventsPanel } from './eventsPanel.js';
import { FieldPanel } from './fieldPanel.js';
import { HealthPanel } from './healthPanel.js';
import { RulesPanel } from './rulesPanel.js';
import { SessionPanel } from './sessionPanel.js';
import { SteerPanel } from './steerPanel.js';
import { TopBar } from './topBar.js';
import { Vitals } from './vitals.js';

export interface PageProps {
  readonly live: Live;
  readonly nowMs: number;
  /** The name of the page in front. */
  readonly page: string;
  /** What is in front, unless it is the Run page. */
  readonly other: ComponentChild;
  readonly theme: Theme;
  readonly keys: boolean;
  readonly settings: BrowserSettings;
  readonly escapeHeld: boolean;
  readonly actions: Actions;
  readonly charts: Charts;
}

/** The whole page from what is known now. What is stale turns grey; the controls never do. */
export function Page(props: PageProps) {
  const { live, nowMs, actions, other } = props;
  const fresh = freshness(live, nowMs);
  const stale = fresh.fresh ? '' : 'stale';
  return (
    <>
      <TopBar {...props} freshness={fresh} />
      <ControlsBar access={live.access} actions={actions} />
      <Banners live={live} freshness={fresh} nowMs={nowMs} actions={actions} />
      {other === undefined ? <Run {...props} stale={stale} /> : other}
      <footer>
        Lapwing is not a safety interlock. It may be used only under an approved protocol, your
        local rules and by trained staff, with a manual switch that cuts the outputs.
      </footer>
    </>
  );
}

function Run({ live, actions, charts, settings, stale }: PageProps & { stale: string }) {
  return (
    <main>
      <div class={`shown now ${stale}`}>
        <Vitals live={live} />
      </div>
      <fieldset class="acting" disabled={!hasControls(live.access)}>
        <AlarmsPanel live={live} actions={actions} />
      </fieldset>
      <div class={`shown seen ${stale}`}>
        <BeltPanel live={live} charts={charts} />
        <SpeedPanel charts={charts} />
      </div>
      <div class="side">
        <fieldset class="acting" disabled={!hasControls(live.access)}>
          <SessionPanel live={live} actions={actions} />
          <SteerPanel live={live} actions={actions} />
        </fieldset>
        <div class={`shown ${stale}`}>
          <RulesPanel live={live} />
          <FieldPanel live={live} />
          <ErrorsPanel live={live} />
        </div>
        <HealthPanel live={live} />
        <BrowserPanel settings={settings} actions={actions} />
      </div>
      <div class={`shown events ${stale}`}>
        <EventsPanel live={live} />
      </div>
    </main>
  );
}
