import { z } from 'zod';
import { recordedWho } from '../../../access/who.js';
import { HttpFault } from '../faults.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { restoreQuery, restoreSchema } from '../schema/backup.js';
import { unitParams } from '../schema/questions.js';

const TYPE = 'application/gzip';
/** The state of a unit of many strings is a hundredth of this; more is no backup [bytes]. */
const BODY_LIMIT = 32 * 1024 * 1024;
const NOBODY = 'somebody on this machine';

/** GET and PUT /api/units/{unit}/backup: a unit's state as a file, and back. */
export const backupRoutes: Routes = (app, { service }) => {
  // Without a limit of its own: other routes keep theirs.
  app.addContentTypeParser(TYPE, { parseAs: 'buffer' }, (_request, body, done) => done(null, body));
  const tags = ['status'];
  const file = { content: { [TYPE]: { schema: z.any() } } };

  app.get(
    '/api/units/:unit/backup',
    {
      config: { role: 'configure' },
      schema: {
        operationId: 'backup',
        summary: 'The whole state of a unit as a file, while it runs',
        tags,
        params: unitParams,
        response: { 200: { description: 'Two lines of JSON, gzipped', ...file }, ...faults },
      },
    },
    async (request, reply) => {
      const { id } = unitOf(service, request.params.unit).unit;
      const made = service.backup(id);
      if (made === null) {
        const expected = 'a unit that has taken a scan in';
        const words = `unit ${id} has no state yet: it waits for its first scan`;
        throw new HttpFault(409, 'no_estimate_yet', words, { field: 'unit', value: id, expected });
      }
      const name = id.replace(/[^\w.-]+/g, '_');
      reply.header('content-disposition', `attachment; filename="${name}.backup.gz"`);
      reply.type(TYPE);
      return reply.send(Buffer.from(made));
    },
  );

  app.put(
    '/api/units/:unit/backup',
    {
      bodyLimit: BODY_LIMIT,
      config: { role: 'configure' },
      schema: {
        operationId: 'restore',
        summary: 'Puts a unit back to a backup and makes up for the time since from the journal',
        description:
          'Other units go on. The file is held against the unit wholly before anything changes; the ' +
          'answer comes when the unit is in its new state. One at a time for a unit.',
        tags,
        params: unitParams,
        querystring: restoreQuery,
        body: file,
        response: { 200: restoreSchema.describe('What was done'), ...faults },
      },
    },
    async (request, reply) => {
      const { id } = unitOf(service, request.params.unit).unit;
      const { body, holder, query } = request;
      if (!Buffer.isBuffer(body) || body.length === 0) {
        const expected = `the file of a backup, as content-type ${TYPE}`;
        const words = `the body is empty; expected ${expected}`;
        throw new HttpFault(400, 'unusable_backup', words, { field: 'body', expected });
      }
      const who = holder === null ? (query.who ?? NOBODY) : String(recordedWho(holder, query.who));
      const answer = await service.restore(id, body, who);
      if (!answer.accepted) {
        const isBusy = answer.is === 'busy';
        throw new HttpFault(
          isBusy ? 409 : 400,
          isBusy ? 'wrong_state' : 'unusable_backup',
          answer.fault,
          {
            field: isBusy ? 'unit' : 'body',
            expected: isBusy
              ? 'one restore at a time'
              : `a backup of unit ${id}; nothing was changed`,
          },
        );
      }
      const { record, same_shape, reaches, anew, lost } = answer;
      const { from, to, scans, revised } = record;
      reply.type('application/json; charset=utf-8');
      return {
        ...{ unit: id, state_of: record.restored?.state_of ?? from, who, from, to, scans, revised },
        ...{ same_shape, reaches, anew: [...anew], lost: [...lost] },
      };
    },
  );
};
