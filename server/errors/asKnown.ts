import { LapwingError } from './codes.js';

/** The error itself when it is a known one; else a fault of Lapwing's own, with all that it says. */
export function asKnown(error: unknown): LapwingError {
  if (error instanceof LapwingError) return error;
  const { message, stack } = error as Error;
  return new LapwingError('loopFailed', stack ?? message, { cause: error });
}
