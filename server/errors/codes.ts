/**
 * Every error that a user can meet, once: its code never changes, and `server/errors/ERRORS.md`
 * has an entry for each (a test holds the two together).
 *
 * The code's first part says where it comes from: WIRE, LINK, RIG, RULES, GUARD, RECORD, LOOP, WEB,
 * CLI.
 */
export interface ErrorEntry {
  readonly code: string;
  /** What happened, in one line, without the particulars. */
  readonly meaning: string;
  /** What to do about it. */
  readonly remedy: string;
}

function entry(code: string, meaning: string, remedy: string): ErrorEntry {
  return { code, meaning, remedy };
}

export const ERRORS = {
  linkPortMissing: entry(
    'LINK_PORT_MISSING',
    'The serial port does not exist.',
    'Run `lapwing ports` to see what is connected, check the cable, and put the path into the rig file.',
  ),
  linkPortBusy: entry(
    'LINK_PORT_BUSY',
    'Another program has the serial port open.',
    'End that program (a serial monitor, another Lapwing) and start again.',
  ),
  rigUnreadable: entry(
    'RIG_UNREADABLE',
    'The rig file cannot be read.',
    'Check the path given to `--rig` and its permissions.',
  ),
  rigInvalid: entry(
    'RIG_INVALID',
    'The rig file does not describe a rig.',
    'Correct each place named; `hardware-sim/demo/rig.yaml` is a whole example.',
  ),
  webPortBusy: entry(
    'WEB_PORT_BUSY',
    'The address that the page should be served at is in use.',
    'End the program that uses it (another Lapwing?), or choose another with `--port`.',
  ),
  webHostNotLoopback: entry(
    'WEB_HOST_NOT_LOOPBACK',
    'The page would be open to the network, and there is no sign-in yet.',
    'Use 127.0.0.1, and reach it from another machine through an SSH tunnel: `ssh -L 8711:127.0.0.1:8711 RIG`.',
  ),
  webHostRefused: entry(
    'WEB_HOST_REFUSED',
    'The request names a host that this service is not.',
    'Open the page at the address that Lapwing printed when it started.',
  ),
  webOriginRefused: entry(
    'WEB_ORIGIN_REFUSED',
    'The request comes from another site.',
    'Use the page that Lapwing itself serves; other sites may not steer a rig.',
  ),
  webBodyInvalid: entry(
    'WEB_BODY_INVALID',
    'The request does not have the form that was expected.',
    'Send JSON (`content-type: application/json`) with the fields that the message names.',
  ),
  webBodyTooLarge: entry(
    'WEB_BODY_TOO_LARGE',
    'The request is longer than any that makes sense here.',
    'Send less at once: a note may have 2000 characters.',
  ),
  webTooManyRequests: entry(
    'WEB_TOO_MANY_REQUESTS',
    'Too many requests came from one address in a short time.',
    'Wait a second. Stopping everything is never limited.',
  ),
  webTooManyViewers: entry(
    'WEB_TOO_MANY_VIEWERS',
    'As many pages are watching as the service allows.',
    'Close pages that nobody looks at, then load this one again.',
  ),
  webNotFound: entry(
    'WEB_NOT_FOUND',
    'There is nothing at this address.',
    'Start from the address that Lapwing printed when it started.',
  ),
  webActUnknown: entry(
    'WEB_ACT_UNKNOWN',
    'The running session has no such button, choice, phase or rules file, or the value is out of bounds.',
    'Load the page again: it shows what this session offers and between which bounds.',
  ),
  webInternal: entry(
    'WEB_INTERNAL',
    'The web process met a fault of its own; the session is not touched by it.',
    'Load the page again. If it comes back, report it with the lines that the service printed.',
  ),
  loopAway: entry(
    'LOOP_AWAY',
    'The loop process is not there, so nothing could be sent to the rig.',
    'Nothing is driven while it is away: the board sets its outputs idle 250 ms after it hears nothing. Look at the terminal that runs Lapwing; the launcher starts the loop again by itself.',
  ),
  loopSilent: entry(
    'LOOP_SILENT',
    'The loop process did not answer in time.',
    'Use the manual switch at the rig if an output must go off now; then look at the terminal that runs Lapwing.',
  ),
  loopTokenRefused: entry(
    'LOOP_TOKEN_REFUSED',
    'The loop process did not accept the token.',
    'Run this command as the user who started Lapwing, and against the same rig.',
  ),
  loopGarbled: entry(
    'LOOP_GARBLED',
    'What came over the local socket is not what a loop process says.',
    'Check that both ends are of the same Lapwing, and that the socket path is right.',
  ),
} as const satisfies Record<string, ErrorEntry>;

export type ErrorName = keyof typeof ERRORS;

/** An error a user can act on: the entry, and the particulars of this case. */
export class LapwingError extends Error {
  readonly code: string;
  readonly remedy: string;

  constructor(name: ErrorName, particulars: string, options?: ErrorOptions) {
    super(particulars, options);
    this.name = 'LapwingError';
    this.code = ERRORS[name].code;
    this.remedy = ERRORS[name].remedy;
  }
}
