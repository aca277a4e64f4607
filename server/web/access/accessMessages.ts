/** What the page is told about sign-in and controls. Types alone: the dashboard imports them. */
/** Who the page's user is: the answer of `/api/me`, and in the stream's `welcome`. */
export interface YouMessage {
  /** False where nobody signs in: everybody is at the rig's own machine and has the controls. */
  readonly signedIn: boolean;
  /** Of this sign-in, as `holder.id` of the controls names it. */
  readonly id: string | null;
  readonly name: string;
  readonly role: 'operator' | 'viewer';
  /** May hold the stimulus back without the controls. */
  readonly mayHold: boolean;
}

/** Who holds the controls: one sign-in, that is, one browser. */
export interface Held {
  /** Counts changes: who takes over names the one that was seen. */
  readonly change: number;
  readonly holder: null | { readonly id: string; readonly name: string; readonly since: string };
}
