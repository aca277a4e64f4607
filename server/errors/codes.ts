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
