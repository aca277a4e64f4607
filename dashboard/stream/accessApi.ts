import { type Answer, post } from './api.js';

export const accessApi = {
  /** @param seen the change of the controls that is on the screen */
  take: (seen: number): Promise<Answer> => post('/api/controls', { take: true, seen }, 5000),
  giveUp: (): Promise<Answer> => post('/api/controls', { take: false }, 5000),
  signOut: (): Promise<Answer> => post('/api/sign-out', {}, 5000),
};

/** A stream that was refused says nothing of why: whoever is signed out is sent to sign in again. */
export async function leaveIfSignedOut(): Promise<void> {
  const answer = await fetch('/api/me').catch(() => undefined);
  if (answer?.status === 401) location.assign('/sign-in.html');
}
