import { LapwingError } from '../errors/codes.js';

/** Prints an error for people: what happened, its code, and what to do about it. */
export function tellError(error: unknown): void {
  const { code, remedy } = error as { code?: unknown; remedy?: unknown };
  const known = error instanceof LapwingError || typeof remedy === 'string';
  const { message, stack } = error as Error;
  if (!known) {
    process.stderr.write(`lapwing: ${stack ?? message}\n`);
    return;
  }
  process.stderr.write(`${message}\n`);
  process.stderr.write(`  ${String(code)}${remedy ? `: ${String(remedy)}` : ''}\n`);
}
