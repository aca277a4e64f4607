import type { FastifyError, FastifyReply } from 'fastify';
import { ERRORS, type ErrorName, LapwingError } from '../errors/codes.js';
import { LoopRefusal } from '../loop/localClient.js';
import type { Problem } from './streamMessages.js';

export const PROBLEM_TYPE = 'application/problem+json';

/** HTTP status of each of our own codes; any other LapwingError is the loop's refusal, 409. */
const STATUS = new Map<string, number>([
  [ERRORS.webHostRefused.code, 421],
  [ERRORS.webOriginRefused.code, 403],
  [ERRORS.webBodyInvalid.code, 400],
  [ERRORS.webBodyTooLarge.code, 413],
  [ERRORS.webTooManyRequests.code, 429],
  [ERRORS.webTooManyViewers.code, 503],
  [ERRORS.webNotFound.code, 404],
  [ERRORS.webPeopleFile.code, 503],
  [ERRORS.webSignInNeeded.code, 401],
  [ERRORS.webSignInWrong.code, 401],
  [ERRORS.webSignInWait.code, 429],
  [ERRORS.webRoleRefused.code, 403],
  [ERRORS.webControlsElsewhere.code, 403],
  [ERRORS.webControlsChanged.code, 409],
  [ERRORS.webActUnknown.code, 422],
  [ERRORS.webRulesPath.code, 422],
  [ERRORS.webRulesChanged.code, 409],
  [ERRORS.webRulesUnwritable.code, 500],
  [ERRORS.webNoRig.code, 503],
  [ERRORS.webRehearsalBusy.code, 409],
  [ERRORS.webSessionUnknown.code, 404],
  [ERRORS.webNoRecords.code, 503],
  [ERRORS.webNotMade.code, 404],
  [ERRORS.webOtherSubjects.code, 422],
  [ERRORS.webTooManyJobs.code, 503],
  [ERRORS.webJobUnknown.code, 404],
  [ERRORS.animalsNoFolder.code, 503],
  [ERRORS.animalsFolderBad.code, 503],
  [ERRORS.animalsUnknown.code, 404],
  [ERRORS.animalsExists.code, 409],
  [ERRORS.animalsEntryBad.code, 422],
  [ERRORS.animalsUnlikely.code, 422],
  [ERRORS.calibrateAnswer.code, 422],
  [ERRORS.animalsAgainst.code, 409],
  [ERRORS.webInternal.code, 500],
  [ERRORS.loopAway.code, 503],
  [ERRORS.loopTokenRefused.code, 503],
  [ERRORS.loopGarbled.code, 502],
  [ERRORS.loopSilent.code, 504],
]);

const TITLES = new Map(Object.values(ERRORS).map((entry) => [entry.code as string, entry.meaning]));

/** The problem details (RFC 9457) of one of our errors. */
export function problemOf(
  error: { code: string; message: string; remedy: string },
  errors?: Problem['errors'],
  status = STATUS.get(error.code) ?? 409,
): Problem {
  return {
    type: `urn:lapwing:error:${error.code}`,
    title: TITLES.get(error.code) ?? 'The loop refused this.',
    status,
    detail: error.message,
    code: error.code,
    remedy: error.remedy,
    ...(errors ? { errors } : {}),
  };
}

export function problem(name: ErrorName, particulars: string): Problem {
  return problemOf(new LapwingError(name, particulars));
}

export function sendProblem(reply: FastifyReply, body: Problem): FastifyReply {
  return reply.code(body.status).type(PROBLEM_TYPE).send(body);
}

/** Whatever was thrown, as problem details; undefined particulars of a fault stay in the log. */
export function problemFrom(error: unknown): Problem {
  if (error instanceof LapwingError || error instanceof LoopRefusal) return problemOf(error);
  const failed = error as FastifyError;
  if (failed.validation) {
    const errors = failed.validation.map((one) => ({
      pointer: '#' + one.instancePath,
      message: one.message ?? 'is not valid',
    }));
    const detail = errors.map((one) => `${one.pointer} ${one.message}`).join('; ');
    return problemOf(new LapwingError('webBodyInvalid', detail), errors);
  }
  if (failed.code === 'FST_ERR_CTP_BODY_TOO_LARGE') {
    return problem('webBodyTooLarge', 'The body is longer than this request may have.');
  }
  if (failed.code === 'FST_ERR_CTP_INVALID_MEDIA_TYPE') {
    const found = problem('webBodyInvalid', 'The content type must be application/json.');
    return { ...found, status: 415 };
  }
  const status = failed.statusCode ?? 500;
  if (status === 404) return problem('webNotFound', 'No such path.');
  if (status >= 400 && status < 500) {
    const found = problem('webBodyInvalid', failed.message);
    return { ...found, status };
  }
  return problem('webInternal', 'Something went wrong here; the log has the particulars.');
}
