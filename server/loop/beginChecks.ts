import { resolve, sep } from 'node:path';
import { LapwingError } from '../errors/codes.js';
import { armFor } from '../session/blinding/arms.js';
import { preflightAgainst } from '../session/preflight.js';
import type { PreparedRules } from '../session/prepare.js';
import type { Rig } from '../session/rig/rig.js';
import { nextSessionNumber, type SessionCard } from '../session/store.js';
import type { Identity } from '../wire/messages.js';
import { isSimulated } from './board.js';
import type { BeginOptions } from './options.js';
import type { ClientMessage } from './protocol.js';

/**
 * What a client asks to begin.
 * @throws LapwingError RULES_OUTSIDE for a file that is not below the rules folder; LOOP_BAD_ACT
 */
export function beginOptionsOf(
  message: Extract<ClientMessage, { say: 'begin' }>,
  rulesFolder: string,
): BeginOptions {
  const rulesPath = resolve(rulesFolder, String(message.rules));
  if (!rulesPath.startsWith(rulesFolder + sep)) {
    throw new LapwingError('rulesOutside', `\`${message.rules}\` leads out of the rules folder.`);
  }
  const subject = String(message.subject ?? '').trim();
  if (subject === '') throw new LapwingError('loopBadAct', 'A session needs a subject.');
  const experimenter = String(message.experimenter ?? '');
  const { protocolNumber, sessionNumber, seed } = message;
  const despite = String(message.despite ?? '').trim();
  return {
    ...{ rulesPath, subject, experimenter },
    ...(protocolNumber ? { protocolNumber } : {}),
    ...(sessionNumber ? { sessionNumber } : {}),
    ...(seed ? { seed } : {}),
    ...(despite === '' ? {} : { despite }),
  };
}

/** @throws LapwingError PREFLIGHT_AGAINST unless there is a reason to begin in spite of it */
export function preflightOverride(
  rig: Rig,
  identity: Identity | undefined,
  despite: string | undefined,
): Pick<SessionCard, 'preflightOverride'> {
  // Without a board no session begins anyway.
  if (identity === undefined) return {};
  const simulated = isSimulated(identity) || rig.port === 'emulated';
  const against = preflightAgainst(rig, simulated, new Date());
  if (against === undefined) return {};
  if (despite) return { preflightOverride: { against, reason: despite } };
  throw new LapwingError('preflightAgainst', `${against}.`);
}

/** The arm of a blinded session; nothing where the rules have no sealed draw. */
export function sealedArm(
  { program }: PreparedRules,
  rig: Rig,
  recordFolder: string,
  { subject, sessionNumber }: Pick<BeginOptions, 'subject' | 'sessionNumber'>,
) {
  if (program.sealed === undefined) return {};
  const number = sessionNumber ?? nextSessionNumber(recordFolder, subject);
  const found = armFor(program.sealed, rig.blinding, subject, number);
  return { sessionNumber: number, ...found };
}
