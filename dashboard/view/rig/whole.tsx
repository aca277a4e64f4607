/** All that the Rig page needs, as one part that is loaded when it is first opened. */
import type { OpenedPage, PageTools } from '../pages.js';
import { RigDesk } from './rigDesk.js';
import { RigPage } from './rigPage.js';

export function open({ touch }: PageTools): OpenedPage {
  const desk = new RigDesk(touch);
  return {
    view: ({ live, theme }) => <RigPage desk={desk} live={live} theme={theme} />,
    shown: () => desk.shown(),
    hidden: () => desk.hidden(),
  };
}
