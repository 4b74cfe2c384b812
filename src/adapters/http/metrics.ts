import { Counter, Gauge, Registry } from 'prom-client';
import { FaultCounts } from './faults.js';
import type { PlantService } from './service.js';

/** A counter's name as Prometheus wants it: `mqtt.late-messages` -> `rockhour_mqtt_late_messages_total`. */
export function metricName(counter: string): string {
  const bare = counter.replace(/[^A-Za-z0-9_]+/g, '_').replace(/_total$/, '');
  return `rockhour_${bare}_total`;
}

/** Two counters whose names differ only in punctuation share a metric; the label keeps them apart. */
function addCounters(registry: Registry, counters: Record<string, number>): void {
  const made = new Map<string, Counter>();
  for (const [name, value] of Object.entries(counters)) {
    const metric = metricName(name);
    let counter = made.get(metric);
    if (counter === undefined) {
      const help = 'A count of the daemon, by its own name';
      counter = new Counter({ name: metric, help, labelNames: ['counter'], registers: [registry] });
      made.set(metric, counter);
    }
    counter.inc({ counter: name }, value);
  }
}

/** The text of /metrics in the Prometheus exposition format; made anew for each scrape. */
export async function metricsText(
  service: PlantService,
  extra: Record<string, number>,
  faults: FaultCounts = new FaultCounts(),
): Promise<{ text: string; contentType: string }> {
  const registry = new Registry();
  const gauge = (name: string, help: string, labelNames: string[] = []) =>
    new Gauge({ name, help, labelNames, registers: [registry] });

  gauge('rockhour_info', 'Always 1; the version is a label', ['version']).set(
    { version: service.version },
    1,
  );
  const part = gauge('rockhour_part_ok', '1 where this part of the daemon is well', ['part']);
  for (const { name, ok } of service.health()) part.set({ part: name }, ok ? 1 : 0);

  const age = gauge('rockhour_reading_age_seconds', 'Age of the newest reading', ['unit']);
  const stale = gauge('rockhour_stale', '1 where the readings of a unit are stale', ['unit']);
  const charge = gauge('rockhour_state_of_charge_ratio', 'Dispatchable over rated energy', [
    'unit',
  ]);
  const thermocouples = gauge(
    'rockhour_thermocouples',
    'Thermocouples of a store by what became of them in the newest scan',
    ['unit', 'store', 'state'],
  );
  const implausible = gauge(
    'rockhour_implausible_reading',
    '1 for a channel whose newest reading no plant produces; it is not used',
    ['unit', 'channel', 'kind'],
  );
  const disagrees = gauge(
    'rockhour_mode_disagrees',
    '1 where mode as told and flow as metered contradict each other in the newest scan',
    ['unit'],
  );
  const ratio = gauge(
    'rockhour_innovation_ratio',
    'Mean square of innovations over what was expected, lately: 1 = as expected',
    ['unit', 'store'],
  );
  const late = gauge('rockhour_scan_lateness_newest_seconds', 'Lateness of the newest scan', [
    'unit',
  ]);
  const waiting = gauge('rockhour_backlog', 'Entries that wait', ['to']);
  for (const [to, count] of Object.entries(service.backlogs())) waiting.set({ to }, count);
  const stands = gauge('rockhour_standing', 'Alarms and alerts in the list', [
    'unit',
    'class',
    'state',
  ]);
  for (const unit of service.unitIds()) {
    const now = service.now(unit);
    if (now === undefined) continue;
    if (now.age_s !== null) age.set({ unit }, now.age_s);
    stale.set({ unit }, now.stale ? 1 : 0);
    for (const [store, { thermocouples: _all, ...by }] of Object.entries(
      now.counts?.stores ?? {},
    )) {
      for (const [state, count] of Object.entries(by)) {
        thermocouples.set({ unit, store, state }, count);
      }
    }
    for (const [store, value] of Object.entries(now.counts?.surprise ?? {})) {
      ratio.set({ unit, store }, value);
    }
    const newest_s = service.scanTimes?.latest(unit);
    if (newest_s !== undefined) late.set({ unit }, newest_s);
    if (now.counts) disagrees.set({ unit }, now.counts.mode_disagrees ? 1 : 0);
    for (const { channel, kind } of now.counts?.implausible ?? []) {
      implausible.set({ unit, channel, kind }, 1);
    }
    if (now.estimate !== null) charge.set({ unit }, now.estimate.state_of_charge);
    for (const event of service.standing(unit)) {
      stands.inc({ unit, class: event.class, state: event.state });
    }
  }
  const { rss, heapUsed, external } = process.memoryUsage();
  gauge('process_resident_memory_bytes', 'Resident memory').set(rss);
  gauge('nodejs_heap_size_used_bytes', 'Heap in use').set(heapUsed);
  gauge('nodejs_external_memory_bytes', 'Memory outside the heap').set(external);
  gauge('process_uptime_seconds', 'Time since the process began').set(process.uptime());
  const counts = (name: string, help: string, of: readonly (readonly [string, number])[]) => {
    const counter = new Counter({ name, help, labelNames: ['code'], registers: [registry] });
    for (const [code, value] of of) counter.inc({ code }, value);
  };
  const errors = 'Failures that the daemon went on from, by code';
  counts('rockhour_errors_total', errors, Object.entries(service.errors()));
  counts('rockhour_http_faults_total', 'Questions answered with a fault, by code', faults.all());
  addCounters(registry, { ...service.counters(), ...extra });
  const all = service.scanTimes ? Registry.merge([registry, service.scanTimes.registry]) : registry;
  return { text: await all.metrics(), contentType: registry.contentType };
}
