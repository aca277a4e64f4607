/** Following and cancelling long work, whoever asked for it. */
import type { FastifyInstance } from 'fastify';
import type { Jobs } from './jobs.js';

type WithId = { Params: { id: string } };

export function addJobRoutes(app: FastifyInstance, jobs: Jobs): void {
  app.get('/api/jobs', async () => ({ jobs: jobs.list() }));
  app.get<WithId>('/api/jobs/:id', async (request) => jobs.told(request.params.id));
  app.delete<WithId>('/api/jobs/:id', { config: { needs: 'operator' } }, async (request) => {
    jobs.cancel(request.params.id);
    return { done: true };
  });
  app.addHook('onClose', async () => jobs.close());
}
