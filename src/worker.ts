import { parentPort, workerData } from 'node:worker_threads';
import { loadSite } from './config/load.js';
import { hoursAt, restoreUnit, type UnitSnapshot } from './core/unit.js';
import { reasonOf } from './errors.js';

/** A question to the worker: hours at some powers from a saved state. */
export interface HoursQuestion {
  readonly id: number;
  readonly unit: string;
  readonly snapshot: UnitSnapshot;
  readonly powers_W: readonly number[];
}

/** `answers` as of `hoursAt`, or the words of what went wrong. */
export interface HoursReply {
  readonly id: number;
  readonly answers?: ReturnType<typeof hoursAt>;
  readonly failure?: string;
}

/**
 * Answers questions that take long, beside the thread that takes scans in. Definitions hold
 * functions, which no message can carry: the worker reads the configuration itself.
 */
function serve(port: NonNullable<typeof parentPort>): void {
  const { configPath } = workerData as { configPath: string };
  const units = new Map(loadSite(configPath).units.map((unit) => [unit.id, unit]));
  port.on('message', ({ id, unit, snapshot, powers_W }: HoursQuestion) => {
    let reply: HoursReply;
    try {
      const definition = units.get(unit);
      if (!definition) throw new RangeError(`unit must be one of the configuration, got ${unit}`);
      reply = { id, answers: hoursAt(definition, restoreUnit(definition, snapshot), powers_W) };
    } catch (thrown) {
      reply = { id, failure: reasonOf(thrown) };
    }
    port.postMessage(reply);
  });
}

if (parentPort) serve(parentPort);
