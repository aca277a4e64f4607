/** All that the Records page needs, as one part that is loaded when it is first opened. */
import type { OpenedPage, PageTools } from '../pages.js';
import { RecordsDesk } from './recordsDesk.js';
import { RecordsPage } from './recordsPage.js';

export function open({ touch }: PageTools): OpenedPage {
  const desk = new RecordsDesk(touch);
  return {
    view: () => <RecordsPage desk={desk} />,
    shown: (rest) => desk.shown(nameIn(rest)),
    hidden: () => desk.hidden(),
  };
}

/** `#records/NAME`: a name that is not well encoded is nobody's. */
function nameIn(rest: string): string {
  try {
    return decodeURIComponent(rest);
  } catch {
    return '';
  }
}
