/** Who asks, and what they may: one function decides, for requests and for the stream alike. */
import { LapwingError } from '../../errors/codes.js';
import type { OperatorAct } from '../../session/inputs.js';
import type { SignIn } from './signIns.js';

/** Without sign-in (loopback) everybody is the operator at the rig's own machine. */
export interface Visitor {
  readonly name: string;
  readonly role: 'operator' | 'viewer';
  /** Undefined without sign-in. */
  readonly signIn: SignIn | undefined;
}

export const AT_THE_RIG: Visitor = { name: '', role: 'operator', signIn: undefined };

/**
 * What a route wants of whoever asks: nothing; to be signed in; to be an operator; to be the operator
 * who holds the controls. A route that says nothing wants `signed in` to read and `controls` to change.
 */
export type Need = 'nothing' | 'signed in' | 'operator' | 'controls';

declare module 'fastify' {
  interface FastifyContextConfig {
    readonly needs?: Need;
  }
}

/** The need of a route that does not name one. */
export function usualNeed(method: string): Need {
  return method === 'GET' || method === 'HEAD' ? 'signed in' : 'controls';
}

/**
 * Refuses what is not allowed.
 * @param holds whether this visitor holds the controls
 * @throws LapwingError WEB_SIGN_IN_NEEDED, WEB_ROLE_REFUSED, WEB_CONTROLS_ELSEWHERE
 */
export function checkNeed(visitor: Visitor | undefined, need: Need, holds: Holder): void {
  if (need === 'nothing') return;
  if (!visitor) throw new LapwingError('webSignInNeeded', 'Nobody is signed in here.');
  if (need === 'signed in') return;
  if (visitor.role !== 'operator') {
    throw new LapwingError('webRoleRefused', `${visitor.name} is signed in as ${visitor.role}.`);
  }
  if (need === 'operator' || holds.isHeldBy(visitor)) return;
  throw new LapwingError('webControlsElsewhere', holds.words);
}

/** Who holds the controls, as far as a check wants to know. */
export interface Holder {
  isHeldBy(visitor: Visitor): boolean;
  /** "anna holds the controls." */
  readonly words: string;
}

/**
 * The acts that need less than the controls: to hold the stimulus back harms nobody, so any operator
 * may, and a viewer where the rig file says so. To let go of it is another matter.
 */
export function needOfAct(act: OperatorAct, visitor: Visitor, viewersMayHold: boolean): Need {
  const holds = act.act === 'hold' && act.what === 'stimulus' && act.on;
  if (act.act === 'stop everything') return 'operator';
  if (!holds) return 'controls';
  return visitor.role === 'viewer' && !viewersMayHold ? 'controls' : 'signed in';
}
