/** What is asked of a session: to begin, to act, to stop, to end; and what it looks like now. */
import type { FastifyInstance } from 'fastify';
import { LapwingError } from '../errors/codes.js';
import type { Beginning } from '../loop/localClient.js';
import type { OperatorAct } from '../session/inputs.js';
import type { Access } from './access/access.js';
import { askedBy } from './access/routes.js';
import { needOfAct } from './access/visitor.js';
import { checkAct } from './acts.js';
import type { LoopSide } from './loopSide.js';
import type { Mirror } from './mirror.js';
import { bodies } from './schemas.js';

/** @param savedRules rules files that lie in the folder by now, offered by the loop or not yet */
export function addSessionRoutes(
  app: FastifyInstance,
  loop: LoopSide,
  mirror: Mirror,
  access: Access,
  savedRules: () => readonly string[],
): void {
  const unknown = (): never => {
    throw loop.client.failure ?? new LapwingError('loopAway', 'The loop has said nothing yet.');
  };
  app.get('/api/setup', async () => mirror.setup ?? unknown());
  app.get('/api/state', async () => mirror.state ?? unknown());

  app.post<{ Body: Beginning }>(
    '/api/session',
    { schema: { body: bodies.begin } },
    async ({ body }) => {
      // Only a file that is offered: no path from a request reaches the file system.
      const offered = [...(mirror.setup?.rulesFiles ?? []), ...savedRules()];
      if (mirror.setup && !offered.includes(body.rules)) {
        const rules = JSON.stringify(body.rules);
        throw new LapwingError('webActUnknown', `There is no rules file ${rules}.`);
      }
      await loop.client.begin(body);
      return { done: true };
    },
  );
  app.post<{ Body: { act: OperatorAct; who?: string } }>(
    '/api/acts',
    // Most acts need more than that: `needOfAct`.
    { config: { needs: 'signed in' }, schema: { body: bodies.act } },
    async (request) => {
      const { act, who } = request.body;
      const visitor = request.visitor!;
      access.check(visitor, needOfAct(act, visitor, access.viewersMayHold));
      checkAct(act, mirror.setup);
      const by = askedBy(request, who);
      await loop.client.act(act, by.who, by.from);
      return { done: true };
    },
  );
  app.post<{ Body: { reason?: string } }>(
    '/api/end',
    { schema: { body: bodies.end } },
    async (request) => {
      const reason = request.body.reason || 'ended from the dashboard';
      await loop.client.end(reason, askedBy(request));
      return { done: true };
    },
  );
  app.post(
    '/api/quiet',
    { config: { needs: 'operator' }, schema: { body: bodies.quiet } },
    async (request) => {
      await loop.stopEverything(askedBy(request));
      return { done: true };
    },
  );
}
