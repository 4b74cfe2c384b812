import { z } from 'zod';
import type { Holder } from '../../../access/access.js';
import { covers, RANKS } from '../../../access/role.js';
import { loginCookie, refuseToken, requireOwnPage, requireRole } from '../auth.js';
import { HttpFault } from '../faults.js';
import { faults, type Routes } from '../routes.js';

const TOKEN = 'a token that rockhour admit has made';
const loginBody = z.strictObject(
  { token: z.string({ error: TOKEN }).min(1, { error: TOKEN }).max(256, { error: TOKEN }) },
  { error: 'an object {"token": ...}' },
);

const holderSchema = z.object({
  asked: z.boolean().describe('Whether rockhour asks for tokens at all'),
  name: z.string().nullable().describe('Whose token came along; recorded with what is done'),
  role: z.enum(RANKS).nullable(),
});

const liveSchema = z.object({ alive: z.literal(true) });

/** GET and POST /api/login, POST /api/logout, GET /api/live: what is open to everybody. */
export const loginRoutes: Routes = (app, { entrance }) => {
  const { access } = entrance;
  const config = { role: 'public' } as const;
  const tags = ['login'];

  const answer = (holder: Holder | null) => {
    const role = holder === null || holder.role === 'feed' ? null : holder.role;
    return { asked: !access.isOpen, name: holder?.name ?? null, role };
  };

  app.get(
    '/api/live',
    {
      config: { ...config, rateLimit: false },
      schema: {
        operationId: 'live',
        summary: 'Whether the process answers, for machines; nothing else is told',
        tags: ['status'],
        response: { 200: liveSchema.describe('It answers') },
      },
    },
    async () => ({ alive: true as const }),
  );

  app.get(
    '/api/login',
    {
      config,
      schema: {
        operationId: 'whoAmI',
        summary: 'Whose token came along, and whether one is asked for',
        tags,
        response: { 200: holderSchema.describe('Who asks'), ...faults },
      },
    },
    async (request) => answer(request.holder),
  );

  app.post(
    '/api/login',
    {
      config,
      bodyLimit: 1024,
      schema: {
        operationId: 'login',
        summary: 'Takes a token for the page and answers with its cookie',
        tags,
        body: loginBody,
        response: { 200: holderSchema.describe('Logged in'), ...faults },
      },
    },
    async (request, reply) => {
      requireOwnPageIfAny(request);
      if (access.isOpen) {
        const words = 'this rockhour asks for no tokens: there is nothing to log in to';
        throw new HttpFault(409, 'wrong_state', words, { expected: 'tokens in http.tokens' });
      }
      const { token } = request.body;
      const holder = access.holderOf(token);
      if (holder === null) throw refuseToken(entrance, request, reply, true);
      // A gateway's token is for the broker; with it the page would show nothing.
      if (!covers(holder.role, 'view')) requireRole(holder, 'view');
      reply.header('set-cookie', loginCookie(entrance, request, token));
      return answer(holder);
    },
  );

  app.post(
    '/api/logout',
    {
      config,
      schema: {
        operationId: 'logout',
        summary: 'Ends the log-in of the page',
        tags,
        response: { 200: holderSchema.describe('Logged out'), ...faults },
      },
    },
    async (request, reply) => {
      requireOwnPageIfAny(request);
      reply.header('set-cookie', loginCookie(entrance, request, null));
      return answer(null);
    },
  );
};

/** A program sends neither of the two; a browser always does, and a foreign page is turned away. */
function requireOwnPageIfAny(request: Parameters<typeof requireOwnPage>[0]): void {
  const { origin, 'sec-fetch-site': site } = request.headers;
  if (origin !== undefined || site !== undefined) requireOwnPage(request);
}
