import { grabberWarnings, portWarnings } from '../link/portWarnings.js';
import { formatProblems } from '../rules/problems.js';
import type { PreparedRules } from '../session/prepare.js';

/** Prints what is legal and suspicious in a rules file, so that nobody meets it on the rig. */
export function tellWarnings({ warnings, file }: PreparedRules): void {
  if (warnings.length === 0) return;
  const color = process.stderr.isTTY === true;
  process.stderr.write(`${formatProblems(warnings, file.sources, { color })}\n`);
}

/** Prints what may go wrong with a serial port, before it does. */
export function tellPortWarnings(port: string): void {
  // The simulated rig and a network have none of a serial line's troubles.
  if (port === 'simulated' || port === 'emulated' || port.includes('://')) return;
  for (const { text, remedy } of [...portWarnings(port), ...grabberWarnings()]) {
    process.stderr.write(`warning: ${text}\n  ${remedy}\n`);
  }
}
