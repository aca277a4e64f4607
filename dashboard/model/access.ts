/** Who looks at this page, and who holds the controls, where people sign in. */
import type { Held, YouMessage } from '../../server/web/access/accessMessages.js';

export interface Access {
  readonly you: YouMessage | undefined;
  readonly controls: Held | undefined;
}

export const noAccess: Access = { you: undefined, controls: undefined };

/** True where this page may act: nobody signs in here, or this browser holds the controls. */
export function hasControls({ you, controls }: Access): boolean {
  if (!you) return true;
  return !you.signedIn || controls?.holder?.id === you.id;
}

/** "viewing only" in words, with the reason; undefined for who may act. */
export function whyViewing(access: Access): string | undefined {
  const { you, controls } = access;
  if (!you || hasControls(access)) return undefined;
  const holder = controls?.holder;
  // Perhaps of the same name, in another browser.
  const elsewhere = holder?.name === you.name ? ' in another browser' : '';
  const whose = holder
    ? `${holder.name} holds the controls${elsewhere}, taken at ${clockTime(holder.since)}.`
    : 'Nobody holds the controls.';
  return you.role === 'viewer' ? `You are signed in as a viewer. ${whose}` : whose;
}

/** The time of day of an RFC 3339 stamp, as this browser's user writes it. */
export function clockTime(stamp: string): string {
  return new Date(stamp).toLocaleTimeString([], { hour: '2-digit', minute: '2-digit' });
}
