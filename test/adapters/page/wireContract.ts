import type { z } from 'zod';
import type { alarmEntrySchema, alarmsSchema } from '../../../src/adapters/http/schema/alarms.js';
import type {
  eventsSchema,
  StreamStateView,
  UnitNowView,
  UnitProfileView,
  unitHistorySchema,
  unitHoursSchema,
  unitListSchema,
} from '../../../src/adapters/http/schema/answers.js';
import type { capabilitySchema } from '../../../src/adapters/http/schema/capability.js';
import type {
  offersHistorySchema,
  offersReportSchema,
  offersSchema,
} from '../../../src/adapters/http/schema/offers.js';
import type { headroomSchema } from '../../../src/adapters/http/schema/plan.js';
import type { scheduleSchema } from '../../../src/adapters/http/schema/schedule.js';
import type {
  AlarmLists,
  AskedHeadroom,
  AskedHours,
  History,
  Profile,
  Standing,
  StreamState,
  Told,
  UnitDefinition,
  UnitList,
} from '../../../src/adapters/page/lib/wire.js';
import type * as Trade from '../../../src/adapters/page/trader/wire.js';

/**
 * What the server sends is what the page reads. The page may not import from the HTTP adapter, so
 * it has types of its own; the compiler holds them against each other here.
 */
type Sends<Sent extends Read, Read> = [Sent, Read];

export type Contract = [
  Sends<StreamStateView, StreamState>,
  Sends<UnitNowView['definition'], UnitDefinition>,
  Sends<UnitProfileView, Profile>,
  Sends<z.output<typeof unitHoursSchema>, AskedHours>,
  Sends<z.output<typeof headroomSchema>, AskedHeadroom>,
  Sends<z.output<typeof unitListSchema>, UnitList>,
  Sends<z.output<typeof unitHistorySchema>, History>,
  Sends<z.output<typeof alarmEntrySchema>, Standing>,
  Sends<z.output<typeof alarmsSchema>, AlarmLists>,
  Sends<z.output<typeof eventsSchema>['events'][number], Told>,
  Sends<UnitNowView['definition'], Trade.TraderDefinition>,
  Sends<z.output<typeof offersSchema>, Trade.OfferTable>,
  Sends<z.output<typeof offersHistorySchema>, Trade.KeptTables>,
  Sends<z.output<typeof offersReportSchema>, Trade.OfferReport>,
  Sends<z.output<typeof scheduleSchema>, Trade.ScheduleCheck>,
  Sends<z.output<typeof headroomSchema>, Trade.Headroom>,
  Sends<z.output<typeof capabilitySchema>, Trade.Capability>,
];
