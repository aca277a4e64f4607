/** Sign-in and controls, and what every request wants of whoever asks, in the OpenAPI description. */
import type { Needs } from '../door.js';
import { asks, json, problems, ref, shows } from '../openapiParts.js';
import { bodies } from '../schemas.js';
import type { Need } from './visitor.js';

const closed = (properties: Record<string, unknown>) => ({
  type: 'object',
  additionalProperties: false,
  required: Object.keys(properties),
  properties,
});

export const accessSchemas = {
  SignIn: bodies.signIn,
  SignOut: bodies.signOut,
  TakeControls: bodies.controls,
  You: closed({
    signedIn: { type: 'boolean', description: 'False where nobody signs in.' },
    id: { type: ['string', 'null'], description: 'Of this sign-in; the controls name it.' },
    name: { type: 'string' },
    role: { enum: ['operator', 'viewer'] },
    mayHold: { type: 'boolean', description: 'May hold the stimulus without the controls.' },
  }),
  Controls: closed({
    change: { type: 'integer', description: 'Counts changes; `seen` of a take-over names it.' },
    holder: {
      oneOf: [
        { type: 'null' },
        closed({
          id: { type: 'string' },
          name: { type: 'string' },
          since: { type: 'string', format: 'date-time' },
        }),
      ],
    },
  }),
};

function answers(description: string, schema: string) {
  return { '200': { description, content: json(ref(schema)) }, default: problems };
}

export const accessPaths = {
  '/api/sign-in': {
    post: {
      ...asks('Sign in; sets the cookie that says who asks.', 'SignIn').post,
      responses: answers('Signed in.', 'You'),
    },
  },
  '/api/sign-out': asks('Sign out here, or everywhere.', 'SignOut'),
  '/api/me': shows('Who is signed in here.', ref('You')),
  '/api/controls': {
    ...shows('Who holds the controls.', ref('Controls')),
    post: {
      ...asks('Take the controls, from somebody too, or give them up.', 'TakeControls').post,
      responses: answers('Who holds them now; recorded if a session runs.', 'Controls'),
    },
  },
};

export const SECURITY_SCHEMES = {
  signIn: {
    type: 'apiKey',
    in: 'cookie',
    name: 'lapwing-RIG',
    description:
      'Set by POST /api/sign-in; a name of its own for each rig, with the prefix __Host- over TLS. ' +
      'Not wanted where the service is bound to loopback and nobody signs in.',
  },
} as const;

type Paths = Readonly<Record<string, object>>;

/** Every operation with what it wants of whoever asks: `security`, and which role as `x-needs`. */
export function securityOf(paths: Paths, needs: Needs): Paths {
  const path = ([name, item]: [string, object]) => {
    const operations = Object.entries(item).map(([method, operation]) => {
      const need = needs.get(`${method.toUpperCase()} ${fastifyPath(name)}`);
      return [method, need ? { ...operation, ...securityFor(need) } : operation];
    });
    return [name, Object.fromEntries(operations)];
  };
  return Object.fromEntries(Object.entries(paths).map(path));
}

function securityFor(need: Need) {
  return { security: need === 'nothing' ? [] : [{ signIn: [] }], 'x-needs': need };
}

/** OpenAPI writes a part that varies as `{name}`, the router as `:name`. */
function fastifyPath(path: string): string {
  return path.replaceAll(/\{(\w+)\}/g, ':$1');
}
