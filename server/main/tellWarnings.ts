import { formatProblems } from '../rules/problems.js';
import type { PreparedRules } from '../session/prepare.js';

/** Prints what is legal and suspicious in a rules file, so that nobody meets it on the rig. */
export function tellWarnings({ warnings, file }: PreparedRules): void {
  if (warnings.length === 0) return;
  const color = process.stderr.isTTY === true;
  process.stderr.write(`${formatProblems(warnings, file.sources, { color })}\n`);
}
