/** The HTTP interface in OpenAPI 3.1, served at `/api/openapi.json`; made of the same schemas that check. */
import { ERRORS } from '../errors/codes.js';
import { accessPaths, accessSchemas, SECURITY_SCHEMES, securityOf } from './access/description.js';
import { animalsPaths } from './animals/description.js';
import { animalsSchemas } from './animals/schemas.js';
import type { Needs } from './door.js';
import { asks, json, problems, ref, shows } from './openapiParts.js';
import { recordsPaths } from './records/description.js';
import { recordsSchemas } from './records/schemas.js';
import { rigPaths, rigSchemas } from './rig/description.js';
import { rulesSchemas } from './rules/answerSchemas.js';
import { bodies } from './schemas.js';
import { STREAM_SCHEMA } from './streamSchema.js';

/**
 * Makes the description once every route is there, with the program's version.
 * @param needs what each route wants of whoever asks, as it is enforced
 */
export function openapi(version: string, needs: Needs): () => Record<string, unknown> {
  let made: Record<string, unknown> | undefined;
  return () => {
    if (!made) {
      const described = describe(version);
      made = { ...described, paths: securityOf(described.paths, needs) };
    }
    return made;
  };
}

function describe(version: string) {
  return {
    openapi: '3.1.0',
    info: {
      title: 'Lapwing',
      version,
      description:
        'Watch and steer the session of one rig. On the rig itself there is no sign-in; over the ' +
        'network a cookie says who asks, and `x-needs` of each request what it wants of them. ' +
        'Requests that change something are JSON, and from a browser only of the same origin. ' +
        'The live stream is a websocket at /api/stream (server/web/HTTP.md).',
    },
    paths: {
      '/api/state': shows('The newest state of belt, session, link and record.', ref('Object')),
      '/api/setup': shows('Rig, rules files, and what the running session offers.', ref('Object')),
      '/api/session': asks('Begin a session.', 'Begin'),
      '/api/acts': asks("An operator's act: an ordered, recorded input of the session.", 'Act'),
      '/api/end': asks('End the session and its record.', 'End'),
      '/api/quiet': asks('Stop everything: all outputs idle, stimuli and water held.', 'Quiet'),
      '/api/rules': shows('The rules files there are, and the names of the rig.', ref('RulesList')),
      '/api/rules/file': {
        get: {
          summary: 'A rules file, as it is on disk.',
          parameters: [{ name: 'path', in: 'query', required: true, schema: { type: 'string' } }],
          responses: {
            '200': { description: 'The file.', content: json(ref('RulesFile')) },
            default: problems,
          },
        },
        put: {
          summary: 'Save a rules file whole; what it replaces stays beside it as NAME.bak.',
          requestBody: { required: true, content: json(ref('SaveRules')) },
          responses: {
            '200': { description: 'Saved.', content: json(ref('Saved')) },
            default: problems,
          },
        },
      },
      '/api/rules/check': {
        post: {
          ...asks('Check a text as a rules file for this rig.', 'CheckRules').post,
          responses: {
            '200': {
              description: 'Every problem, an outline with places on the belt, and plain words.',
              content: json(ref('RulesChecked')),
            },
            default: problems,
          },
        },
      },
      '/api/rehearse': {
        ...shows('The newest rehearsal: how far it is, or its result.', ref('Rehearsal')),
        post: {
          ...asks('Rehearse a text on the simulated rig, one at a time.', 'Rehearse').post,
          responses: {
            '200': { description: 'It has begun.', content: json(ref('Begun')) },
            default: problems,
          },
        },
        delete: {
          summary: 'Cancel the rehearsal that runs, if one does.',
          responses: {
            '200': { description: 'None runs.', content: json(ref('Done')) },
            default: problems,
          },
        },
      },
      ...recordsPaths,
      ...animalsPaths,
      ...rigPaths,
      ...accessPaths,
      '/api/openapi.json': shows('This description.', ref('Object')),
      '/healthz': shows('Whether this process lives and has the loop.', ref('Object')),
    },
    components: {
      securitySchemes: SECURITY_SCHEMES,
      schemas: {
        ...accessSchemas,
        StreamMessage: STREAM_SCHEMA,
        Begin: bodies.begin,
        Act: bodies.act,
        End: bodies.end,
        Quiet: bodies.quiet,
        CheckRules: bodies.checkRules,
        SaveRules: bodies.saveRules,
        Rehearse: bodies.rehearse,
        ...rulesSchemas,
        ...recordsSchemas,
        ...animalsSchemas,
        ...rigSchemas,
        Object: { type: 'object' },
        Done: { type: 'object', required: ['done'], properties: { done: { const: true } } },
        Problem: {
          type: 'object',
          required: ['type', 'title', 'status', 'detail', 'code', 'remedy'],
          properties: {
            type: { type: 'string', format: 'uri' },
            title: { type: 'string' },
            status: { type: 'integer' },
            detail: { type: 'string' },
            code: {
              type: 'string',
              description: 'One of the codes in server/errors/ERRORS.md.',
              examples: [ERRORS.loopAway.code, ERRORS.webBodyInvalid.code],
            },
            remedy: { type: 'string' },
            errors: {
              type: 'array',
              items: {
                type: 'object',
                properties: { pointer: { type: 'string' }, message: { type: 'string' } },
              },
            },
          },
        },
      },
    },
  };
}
