/** Signing in and out, who is who, and the controls. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { LapwingError } from '../../errors/codes.js';
import type { Actor } from '../../session/inputs.js';
import { bodies } from '../schemas.js';
import { callerOf } from '../senders.js';
import type { Access } from './access.js';
import type { YouMessage } from './accessMessages.js';
import type { Visitor } from './visitor.js';

export function addAccessRoutes(app: FastifyInstance, access: Access): void {
  app.post<{ Body: { name: string; secret: string } }>(
    '/api/sign-in',
    { config: { needs: 'nothing' }, schema: { body: bodies.signIn } },
    async (request, reply) => {
      if (!access.signInUsed) throw new LapwingError('webNotFound', 'Nobody has to sign in here.');
      const { name, secret } = request.body;
      const { sender, visitor } = request;
      const { signIn, cookie } = await access.signIn(name, secret, {
        address: callerOf(sender.address),
        secure: sender.secure,
        ...(visitor?.signIn ? { before: visitor.signIn } : {}),
      });
      reply.header('set-cookie', cookie);
      return youOf({ name: signIn.name, role: signIn.role, signIn }, access);
    },
  );
  app.post<{ Body: { everywhere?: boolean } }>(
    '/api/sign-out',
    { config: { needs: 'signed in' }, schema: { body: bodies.signOut } },
    async (request, reply) => {
      const { signIn } = request.visitor!;
      const { everywhere } = request.body;
      if (signIn)
        access.signIns.end((one) => (everywhere ? one.name === signIn.name : one === signIn));
      reply.header('set-cookie', access.noCookie(request.sender.secure));
      // What the browser kept of the session goes too (the `Clear-Site-Data` of the W3C draft).
      reply.header('clear-site-data', '"cache"');
      return { done: true };
    },
  );
  app.get('/api/me', async (request) => youOf(request.visitor!, access));
  app.get('/api/controls', async () => access.controls.now);
  app.post<{ Body: { take: boolean; seen?: number } }>(
    '/api/controls',
    { config: { needs: 'operator' }, schema: { body: bodies.controls } },
    async (request) => {
      const { signIn } = request.visitor!;
      const { take, seen } = request.body;
      if (!signIn)
        throw new LapwingError('webNotFound', 'Without sign-in everybody has the controls.');
      const { from } = askedBy(request);
      if (take) await access.controls.take(signIn, from, seen);
      else await access.controls.giveUp(signIn, from);
      // Signed out while the loop was recording it: nobody may be left holding them.
      if (!access.signIns.byId(signIn.id)) access.controls.freeFrom([signIn.id]);
      return access.controls.now;
    },
  );
}

/** Who this is, and what the page may offer. */
export function youOf(visitor: Visitor, access: Access): YouMessage {
  const { name, role, signIn } = visitor;
  const mayHold = role === 'operator' || access.viewersMayHold;
  return { signedIn: signIn !== undefined, id: signIn?.id ?? null, name, role, mayHold };
}

/** Who asks and from where, for the record: a signed-in name is certain, what a page adds is not. */
export function askedBy({ visitor, sender }: FastifyRequest, said?: string): Actor {
  const name = visitor?.name ?? '';
  const from = `dashboard ${sender.address}`;
  if (name === '') return { who: said || 'operator', from };
  return { who: said && said !== name ? `${said} (signed in as ${name})` : name, from };
}
