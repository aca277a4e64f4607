import { readFileSync } from 'node:fs';
import { LapwingError } from '../../errors/codes.js';
import type { Sealed } from '../../rules/sealed.js';
import { openSlot, type SealedAllocation, type SealedSlot, slotFor } from './allocation.js';

/** What a session's description keeps of its arm. */
export interface Blinding {
  /** Id of the allocation and its commitment. */
  readonly allocation: string;
  readonly commitment: string;
  /** Where the allocation and its key were. */
  readonly file: string;
  readonly key: string;
  readonly slot: SealedSlot;
  readonly opened?: Opened;
}
export interface Opened {
  readonly at: string;
  readonly by: string;
  readonly reason: string;
  readonly arm: string;
}

/** @throws LapwingError BLINDING_BAD */
export function readAllocation(file: string): SealedAllocation {
  try {
    const found = JSON.parse(readFileSync(file, 'utf8')) as Partial<SealedAllocation>;
    const { format, id, slots, commitment } = found;
    if (format === 1 && typeof id === 'string' && Array.isArray(slots) && commitment) {
      return found as SealedAllocation;
    }
    throw new Error('it is no sealed allocation of format 1');
  } catch (error) {
    const what = `${file}: ${(error as Error).message}`;
    throw new LapwingError('blindingBad', what, { cause: error });
  }
}

/** @throws LapwingError BLINDING_KEY */
export function readKey(file: string): string {
  try {
    return readFileSync(file, 'utf8').trim();
  } catch (error) {
    const what = `${file}: ${(error as Error).message}`;
    throw new LapwingError('blindingKey', what, { cause: error });
  }
}

/**
 * The arm for a session that is about to begin, and what its description keeps; nothing for a rules
 * file without a sealed draw.
 * @throws LapwingError BLINDING_NONE, BLINDING_NO_SLOT, BLINDING_KEY, BLINDING_BAD
 */
export function armFor(
  sealed: Sealed | undefined,
  where: { readonly allocation: string; readonly key: string } | undefined,
  subject: string,
  session: number | null,
): { readonly arm?: string; readonly blinding?: Blinding } {
  if (sealed === undefined) return {};
  if (where === undefined) {
    throw new LapwingError(
      'blindingNone',
      `\`${sealed.draw}\` is sealed, and no allocation is set.`,
    );
  }
  const allocation = readAllocation(where.allocation);
  const slot = slotFor(allocation, subject, session);
  const { id, commitment } = allocation;
  const blinding = { allocation: id, commitment, file: where.allocation, key: where.key, slot };
  return { arm: wordOf(sealed, openSlot(id, slot, readKey(where.key))), blinding };
}

/**
 * The arm of a session that was recorded, for the engine's own use: as it was opened, or by the key.
 * Undefined where there is none, or the key is not at hand.
 */
export function armOf(blinding: Blinding | undefined): string | undefined {
  if (blinding === undefined) return undefined;
  if (blinding.opened !== undefined) return blinding.opened.arm;
  try {
    return openSlot(blinding.allocation, blinding.slot, readKey(blinding.key));
  } catch {
    return undefined;
  }
}

/** @throws LapwingError BLINDING_SEALED where the engine cannot run without knowing the arm */
export function needArm(blinding: Blinding | undefined, arm: string | undefined): void {
  if (blinding === undefined || arm !== undefined) return;
  throw new LapwingError('blindingSealed', `The key is not at ${blinding.key}.`);
}

/** Refuses what would show the arm of a session that is still sealed. @throws BLINDING_SEALED */
export function refuseSealed(blinding: Blinding | undefined, what: string): void {
  if (blinding === undefined || blinding.opened !== undefined) return;
  throw new LapwingError('blindingSealed', `${what} would show the arm.`);
}

function wordOf({ arms, draw }: Sealed, arm: string): string {
  if (arms.includes(arm)) return arm;
  // Its name must not be told: that would show it.
  throw new LapwingError('blindingBad', `The arm allotted is none that \`${draw}\` knows.`);
}
