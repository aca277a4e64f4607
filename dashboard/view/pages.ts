/** The pages of the dashboard. To add one, write its folder, with a `whole.tsx`, and its line here. */
import type { ComponentChild } from 'preact';
import type { Live } from '../model/live.js';
import type { Actions, Theme } from './actions.js';

/** What a page is drawn from, besides what it knows itself. */
export interface Look {
  readonly live: Live;
  readonly nowMs: number;
  readonly theme: Theme;
  readonly actions: Actions;
}

/** What a page may use of the rest. */
export interface PageTools {
  /** Something changed: the page is drawn again on the next animation frame. */
  touch(): void;
  /** Small things that the browser keeps, under names that begin with `lapwing.`. */
  recall(name: string): string | null;
  keep(name: string, value: string): void;
}

/** A page that was opened once: what it knows stays while another one is shown. */
export interface OpenedPage {
  view(look: Look): ComponentChild;
  /** It is in front now; `rest` is what followed its name: `abc` for `#records/abc`. */
  shown?(rest: string): void;
  /** Another page is in front: time to stop asking the service for news. */
  hidden?(): void;
  /** Whether closing the window would lose something. */
  readonly unsaved?: boolean;
}

/** What the `whole.tsx` of a page's folder exports. */
export interface PageModule {
  open(tools: PageTools): OpenedPage;
}

export interface PageEntry {
  /** In the address, after `#`. */
  readonly name: string;
  readonly title: string;
  /** Loads the page when it is first asked for. The Run page has none: it is always there. */
  readonly load?: () => Promise<PageModule>;
}

export const PAGES: readonly [PageEntry, ...PageEntry[]] = [
  { name: 'run', title: 'Run' },
  { name: 'rehearse', title: 'Rehearse', load: () => import('./rehearse/whole.js') },
  { name: 'records', title: 'Records', load: () => import('./records/whole.js') },
  { name: 'animals', title: 'Animals', load: () => import('./animals/whole.js') },
  { name: 'rig', title: 'Rig', load: () => import('./rig/whole.js') },
];
