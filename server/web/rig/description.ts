/** The Rig page's half of the description of the HTTP interface (OpenAPI). */
import { asks, done, json, problems, ref, shows } from '../openapiParts.js';
import { rigBodies } from './schemas.js';

const told = (summary: string, body: string, what: string) => ({
  post: {
    ...asks(summary, body).post,
    responses: { '200': { description: what, content: json(ref('Object')) }, default: problems },
  },
});

export const rigPaths = {
  '/api/rig': shows(
    'The rig: its settings with their meaning, calibrations with ages, the last pre-flight.',
    ref('Object'),
  ),
  '/api/rig/ports': shows('Serial devices that are connected, with warnings.', ref('Object')),
  '/api/rig/bench': {
    get: {
      ...shows('Raw edges and output changes after number `after`, in board time.', ref('Object'))
        .get,
      parameters: [{ name: 'after', in: 'query', schema: { type: 'string' } }],
    },
  },
  '/api/rig/try': told(
    'One pulse of one output, through the guards, between sessions only.',
    'RigTry',
    'What the board measured.',
  ),
  '/api/rig/guide': {
    ...shows('The guide that goes on: what it shows and asks, or its result.', ref('Object')),
    ...told('Begin a guide; one at a time.', 'RigGuide', 'Where it is.'),
    delete: {
      summary: 'Stop the guide that goes on; outputs go idle and nothing is kept.',
      responses: { '200': done, default: problems },
    },
  },
  '/api/rig/guide/answer': told('Answer what the guide asks now.', 'RigAnswer', 'Where it is.'),
  '/api/rig/preflight': {
    ...shows('The newest pre-flight of the last twelve hours, or null.', ref('Object')),
    ...told('Begin a pre-flight, as a guide.', 'RigNothing', 'Where it is.'),
  },
  '/api/rig/calibrations/use': asks('Put a kept calibration in force in the rig file.', 'RigUse'),
};

export const rigSchemas = {
  RigTry: rigBodies.attempt,
  RigGuide: rigBodies.guide,
  RigAnswer: rigBodies.answer,
  RigUse: rigBodies.use,
  RigNothing: rigBodies.nothing,
};
