import type { UnitDefinition } from '../core/definitions.js';
import type { WatchEvent } from '../core/watch/event.js';
import {
  type ServiceWatchState,
  startServiceWatch,
  stepServiceWatch,
} from '../core/watch/service.js';

export const DATABASE = 'InfluxDB';

/** The alert `database_unreachable` of each unit, with the unit's own delays. */
export class DatabaseWatch {
  private readonly states = new Map<string, ServiceWatchState>();

  /** @param stands ids of events that stand from before this start */
  constructor(
    private readonly units: readonly UnitDefinition[],
    stands: ReadonlySet<string>,
  ) {
    for (const unit of units) {
      const state = startServiceWatch();
      state.condition.raised = stands.has(`${unit.id}/database_unreachable/${DATABASE}`);
      this.states.set(unit.id, state);
    }
  }

  /** Takes in whether the database can be reached now; gives what was raised or returned by it. */
  step(time_ms: number, trouble: string | null): WatchEvent[] {
    return this.units.flatMap((unit) => {
      const event = stepServiceWatch(unit.watch.database_down, this.states.get(unit.id)!, {
        unit: unit.id,
        service: DATABASE,
        time_ms,
        reachable: trouble === null,
        detail: trouble ?? '',
      });
      return event ? [event] : [];
    });
  }
}
