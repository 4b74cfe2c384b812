import type { InfluxForwarder } from '../adapters/history/influxForwarder.js';
import type { Outbox } from '../adapters/history/outbox.js';
import type { HealthPart } from '../adapters/http/service.js';
import type { EdgeNodeState } from '../adapters/mqtt/sparkplug/host.js';
import type { LeftOutUnit } from '../config/site.js';
import { LEAST_DATE_MS } from '../core/scan/assemble.js';
import type { DaemonClock } from './clock.js';
import { type ClockStep, stepWords } from './clockSteps.js';
import { returnWords } from './clockStretch.js';
import { zoneWords } from './clockWords.js';
import type { UnitRunner } from './unitRunner.js';

export function brokerHealth(
  url: string,
  isConnected: boolean,
  trouble: string | null,
  refused: string | null,
): HealthPart {
  const why = trouble === null ? '' : ` (${trouble})`;
  const detail = isConnected
    ? `connected to ${url}`
    : `no connection to ${url}${why}; keeps trying`;
  return {
    name: 'mqtt',
    ok: isConnected && refused === null,
    detail: refused === null ? detail : `${detail}; a subscription was refused: ${refused}`,
  };
}

/** The local store: journal and history. */
export function storeHealth(
  folder: string,
  isStuck: boolean,
  backlog: number,
  trouble: string | null,
): HealthPart {
  if (isStuck) {
    const detail = `the journal in ${folder} cannot be written; messages wait at the broker`;
    return { name: 'store', ok: false, detail };
  }
  const detail = `${backlog} readings to work off in ${folder}`;
  return trouble === null
    ? { name: 'store', ok: true, detail }
    : { name: 'store', ok: false, detail: `${detail}; ${trouble}` };
}

export function databaseHealth(forwarder: InfluxForwarder, outbox: Outbox): HealthPart {
  const { backlog } = outbox;
  const { trouble } = forwarder;
  if (trouble !== null) {
    const detail = `${trouble}; ${backlog} entries wait in the local store, none is lost`;
    return { name: 'influxdb', ok: false, detail };
  }
  const detail = forwarder.proven ? `${backlog} entries to forward` : 'not reached yet';
  return { name: 'influxdb', ok: true, detail };
}

/** This machine's clock: its date, and whether it was set since the start. */
export function clockHealth(now_ms: number, step: ClockStep | null): HealthPart {
  const stands = new Date(now_ms).toISOString();
  if (now_ms < LEAST_DATE_MS) {
    const detail = `this machine's clock has lost its date, it stands at ${stands}: set it`;
    return { name: 'clock', ok: false, detail };
  }
  return { name: 'clock', ok: true, detail: step === null ? 'was not set' : stepWords(step) };
}

/** An edge node of Sparkplug that readings come from. */
export function edgeNodeHealth({ name, absent }: EdgeNodeState): HealthPart {
  const ok = absent.length === 0;
  return { name: `edge node ${name}`, ok, detail: ok ? 'alive' : absent.join(', ') };
}

export function unitHealth(
  runner: UnitRunner,
  failure: string | undefined,
  clock: DaemonClock,
  future: number,
  late = '',
): HealthPart {
  const name = `unit ${runner.unit.id}`;
  if (failure !== undefined) return { name, ok: false, detail: `the last scan failed: ${failure}` };
  const ahead =
    future === 0 ? '' : `; ${future} readings stamped ahead of this machine's clock were not used`;
  const rewound = late === '' ? '' : `; ${late}`;
  const told = `${ahead}${rewound}${zonesOff(runner.wrongZones)}${lostAtStart(runner.lost)}${clocksOff(runner)}`;
  if (runner.newest_ms === null) return { name, ok: false, detail: `no reading yet${told}` };
  const age_s = Math.max(0, (clock.now() - runner.newest_ms) / 1000);
  const ok = age_s <= runner.unit.watch.data_age_s.limit;
  return { name, ok, detail: `newest reading ${Math.round(age_s)} s old${told}` };
}

function clocksOff({ clocks }: UnitRunner): string {
  const { waiting, stretches } = clocks;
  const last = stretches.at(-1);
  const doubt =
    waiting > 0 ? `; ${waiting} readings live by this machine's clock wait: it stands ahead` : '';
  return `${doubt}${last ? `; ${returnWords(last)}` : ''}`;
}

/** A unit that is not run until its configuration is mended. */
export function leftOutHealth({ id, faults }: LeftOutUnit): HealthPart {
  const [first] = faults;
  const more = faults.length > 1 ? `, and ${faults.length - 1} more` : '';
  const detail =
    `left out, its readings are not taken in; faults in the configuration: ` +
    `${first!.path}: found ${first!.found}, expected ${first!.expected}${more}`;
  return { name: `unit ${id}`, ok: false, detail };
}

/** Further behind its journal than this, its figures are of before [entries]. */
export const READY_BEHIND_MOST = 10_000;

/** Why the daemon cannot do its work now; empty where it can. */
export function unreadyReasons(of: {
  readonly started: boolean;
  readonly isStuck: boolean;
  readonly backlog: number;
}): string[] {
  return [
    ...(of.started ? [] : ['it is still starting, or stops']),
    ...(of.isStuck ? ['the journal cannot be written'] : []),
    ...(of.backlog > READY_BEHIND_MOST
      ? [`${of.backlog} readings are to be worked off, more than ${READY_BEHIND_MOST}`]
      : []),
  ];
}

/** Names told in full; the log has them all. */
const NAMES_MOST = 3;

function zonesOff(found: UnitRunner['wrongZones']): string {
  if (found.length === 0) return '';
  const more = found.length > NAMES_MOST ? `, and ${found.length - NAMES_MOST} more` : '';
  const named = found.slice(0, NAMES_MOST).map(({ channel, hours }) => {
    return `${channel} is ${zoneWords(hours)}`;
  });
  return `; not used: ${named.join(', ')}${more}`;
}

function lostAtStart(lost: readonly string[]): string {
  if (lost.length === 0) return '';
  const more = lost.length > NAMES_MOST ? ` and ${lost.length - NAMES_MOST} more` : '';
  const names = lost.slice(0, NAMES_MOST).join(', ');
  return `; what was healthy was lost at this start and is learned anew: ${names}${more}`;
}
