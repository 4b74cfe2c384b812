import { HttpFault } from '../faults.js';
import { faults, type Routes, unitOf } from '../routes.js';
import {
  playbackSchema,
  profileQuery,
  profilesQuery,
  unitProfileSchema,
} from '../schema/playback.js';
import { unitParams } from '../schema/questions.js';
import type { PlantService, StoredMoment, UnitNow } from '../service.js';
import { ageOf, momentView, noEstimate, withoutSigma } from '../views.js';
import { spanOf } from './history.js';

const POINTS = 60;

/** The moment asked for, else the present one. */
function momentOf(service: PlantService, now: UnitNow, time_ms: number | undefined): StoredMoment {
  if (time_ms === undefined) {
    if (now.profile === null) throw noEstimate(now.unit.id);
    return { ...now, profile: now.profile };
  }
  const found = service.momentAt(now.unit.id, time_ms);
  if (found !== null) return found;
  const time = new Date(time_ms).toISOString();
  throw new HttpFault(
    404,
    'nothing_stored',
    `no profile of unit ${now.unit.id} is stored at or before ${time}`,
    { field: 'time', value: time, expected: 'a later time' },
  );
}

/** GET /api/units/{unit}/profile, .../profiles */
export const profileRoutes: Routes = (app, { service }) => {
  const tags = ['units'];

  app.get(
    '/api/units/:unit/profile',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'profile',
        summary: 'Temperatures along each store: estimate, sigma and readings',
        tags,
        params: unitParams,
        querystring: profileQuery,
        response: {
          200: unitProfileSchema.describe('The newest profile, or one of the past by ?time='),
          ...faults,
        },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const moment = momentView(momentOf(service, now, request.query.time));
      return { ...moment, age_s: ageOf(now, moment.time) };
    },
  );

  app.get(
    '/api/units/:unit/profiles',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'profiles',
        summary: 'Stored profiles of a span, each with the estimate of its time, for playback',
        description:
          'One is stored every 10 minutes of source time. Of more than `points` the last in each of ' +
          `so many equal stretches (${POINTS} unless asked otherwise); a stretch without any is left ` +
          'out. Without from and to: the 24 h before the newest estimate.',
        tags: ['history'],
        params: unitParams,
        querystring: profilesQuery,
        response: { 200: playbackSchema.describe('Oldest first'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const { points = POINTS, sigma } = request.query;
      const { from, to } = spanOf(request.query, now.estimate?.time);
      const { rows, thinned, every_ms } = service.moments(now.unit.id, from, to, points);
      const profiles = rows.map(momentView);
      return {
        unit: now.unit.id,
        from: new Date(from).toISOString(),
        to: new Date(to).toISOString(),
        thinned,
        every_s: every_ms / 1000,
        profiles: sigma === 'no' ? profiles.map(withoutSigma) : profiles,
      };
    },
  );
};
