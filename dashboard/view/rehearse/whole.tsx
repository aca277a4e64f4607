/** All that the Rehearse page needs, as one part that is loaded when it is first opened. */
import type { OpenedPage, PageTools } from '../pages.js';
import { Desk } from './desk.js';
import { RehearsePage } from './rehearsePage.js';

/** Opens with the file that was open last. */
export function open({ touch, recall, keep }: PageTools): OpenedPage {
  const desk = new Desk(() => {
    if (desk.state.path !== undefined) keep('lapwing.rules', desk.state.path);
    touch();
  });
  return {
    view: ({ theme }) => <RehearsePage desk={desk} theme={theme} />,
    shown: () => void desk.start(recall('lapwing.rules') ?? undefined),
    get unsaved() {
      return desk.unsaved;
    },
  };
}
