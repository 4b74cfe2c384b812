import type { FastifyReply } from 'fastify';
import { z } from 'zod';
import { HttpFault, unknownUnit } from '../faults.js';
import { faults, type Routes } from '../routes.js';
import { streamQuery } from '../schema/questions.js';
import type { StreamSink } from '../stream-client.js';

/** Media ranges that admit an event stream (RFC 9110, 12.5.1); a missing header admits all. */
function admitsStream(accept: string | undefined): boolean {
  if (accept === undefined || accept === '') return true;
  return accept.split(',').some((range) => {
    const [type = '', ...parameters] = range.split(';').map((part) => part.trim().toLowerCase());
    const refused = parameters.some((parameter) => /^q=0(\.0*)?$/.test(parameter));
    return !refused && ['text/event-stream', 'text/*', '*/*'].includes(type);
  });
}

/**
 * The plugin's own `send` waits for `drain` alone, which never comes from a client that went away
 * with a full socket; so it only opens and closes the stream, and the writing is done here.
 */
function sinkOf(reply: FastifyReply): StreamSink {
  const { raw, sse } = reply;
  return {
    write(text) {
      if (raw.destroyed || raw.writableEnded || raw.write(text)) return Promise.resolve();
      return new Promise((resolve) => {
        const done = () => {
          raw.off('drain', done);
          raw.off('close', done);
          resolve();
        };
        raw.once('drain', done);
        raw.once('close', done);
      });
    },
    destroy: () => void raw.destroy(),
    end: () => sse.close(),
    onClose: (callback) => void raw.once('close', callback),
  };
}

/** GET /api/stream: Server-Sent Events. */
export const streamRoutes: Routes = (app, { service, stream, tuning, entrance }) => {
  app.get(
    '/api/stream',
    {
      // `manual`: the plugin's own refusal would not have the form of our errors.
      sse: { kind: 'manual', heartbeat: false },
      config: { role: 'view' },
      schema: {
        operationId: 'stream',
        summary: 'Live stream',
        description:
          'Server-Sent Events: hello, state, event, alarms, beat. After a loss, send the last id as ' +
          'Last-Event-ID (or last_event_id); hello then says "resumed", or "gap" where events ' +
          'were missed that are no longer kept.',
        tags: ['live'],
        querystring: streamQuery,
        response: {
          200: {
            description: 'Events as they come',
            content: { 'text/event-stream': { schema: z.string() } },
          },
          ...faults,
        },
      },
    },
    async (request, reply) => {
      const { profile, last_event_id } = request.query;
      if (!admitsStream(request.headers.accept)) {
        throw new HttpFault(406, 'not_acceptable', 'this route only sends text/event-stream', {
          field: 'Accept',
          value: request.headers.accept,
          expected: 'text/event-stream',
        });
      }
      if (profile !== undefined && service.now(profile) === undefined) {
        throw unknownUnit(profile, service.unitIds(), 400);
      }
      const { holder } = request;
      const isFull = stream.open >= tuning.streams_most;
      if (isFull || (holder !== null && stream.openOf(holder.name) >= tuning.streams_each_most)) {
        const [open, most, by] = isFull
          ? [stream.open, tuning.streams_most, '']
          : [stream.openOf(holder?.name ?? ''), tuning.streams_each_most, ' with this token'];
        reply.header('retry-after', '5');
        throw new HttpFault(
          503,
          'too_many_streams',
          `${open} live streams are open${by}, the most that are served at once`,
          { expected: `at most ${most} streams${by}` },
        );
      }
      const lastId = request.headers['last-event-id'] ?? last_event_id ?? null;
      reply.sse.keepAlive();
      reply.sse.sendHeaders(200);
      const sink = sinkOf(reply);
      const { access } = entrance;
      // A token that is taken back ends what was begun with it.
      const end = access.onChange(() => {
        if (holder === null ? !access.isOpen : !access.stillHolds(holder)) sink.end();
      });
      sink.onClose(end);
      stream.attach(
        sink,
        typeof lastId === 'string' ? lastId : null,
        profile ?? null,
        holder?.name,
      );
    },
  );
};
