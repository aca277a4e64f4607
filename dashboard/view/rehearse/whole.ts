/** All that the Rehearse page needs, as one part that is loaded when it is first opened. */
export { Desk } from './desk.js';
export { RehearsePage } from './rehearsePage.js';
