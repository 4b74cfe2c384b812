import type { z } from 'zod';
import type {
  PlaybackView,
  UnitProfileView,
  WatchHistoryView,
} from '../../../src/adapters/http/schema/playback.js';
import type { cyclesSchema, watchSchema } from '../../../src/adapters/http/schema/watch.js';
import type { UnitWorthView } from '../../../src/adapters/http/schema/worth.js';
import type {
  PastProfile,
  Playback,
  Runs,
  SensorWorth,
  Watch,
  WatchHistory,
} from '../../../src/adapters/page/maintenance/wire.js';

/** As `wireContract.ts`: what the server sends is what the maintenance sheet reads. */
type Sends<Sent extends Read, Read> = [Sent, Read];

export type MaintenanceContract = [
  Sends<z.output<typeof watchSchema>, Watch>,
  Sends<WatchHistoryView, WatchHistory>,
  Sends<z.output<typeof cyclesSchema>, Runs>,
  Sends<UnitProfileView, PastProfile>,
  Sends<PlaybackView, Playback>,
  Sends<UnitWorthView, SensorWorth>,
];
