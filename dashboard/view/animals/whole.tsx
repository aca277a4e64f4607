/** All that the Animals page needs, as one part that is loaded when it is first opened. */
import type { OpenedPage, PageTools } from '../pages.js';
import { AnimalsDesk } from './animalsDesk.js';
import { AnimalsPage } from './animalsPage.js';

export function open({ touch }: PageTools): OpenedPage {
  const desk = new AnimalsDesk(touch);
  return {
    view: () => <AnimalsPage desk={desk} />,
    shown: (rest) => desk.shown(decoded(rest)),
    hidden: () => desk.hidden(),
  };
}

/** `#animals/NAME`. */
function decoded(rest: string): string {
  try {
    return decodeURIComponent(rest);
  } catch {
    return '';
  }
}
