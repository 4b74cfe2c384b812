import { FORWARDER_COUNTS } from '../adapters/history/influxForwarder.js';
import { INTAKE_COUNTS } from '../adapters/mqtt/intake.js';
import { OWN_NODE_COUNTS } from '../adapters/mqtt/sparkplug/ownNode.js';
import { WEBHOOK_COUNTS } from '../adapters/notify/webhookForwarder.js';
import { READING_FATES } from '../core/scan/assemble.js';
import type { ScanCounts } from '../core/scanCounts.js';
import { IMPLAUSIBLE_KINDS } from '../core/track/plausible.js';
import { ERRORS, type ErrorCode, RockhourError } from '../errors.js';

/** Counters of the daemon itself; those of its parts are documented there. */
const OWN_COUNTS = [
  /** Scans that the estimator took in, by why they were closed, and those without any reading. */
  'scans',
  'scans_complete',
  'scans_deadline',
  'scans_empty',
  /** Scans left out because a gap was too long to tick through. */
  'scans_skipped',
  /** Scans on which the estimator failed; it went on from its last sound state. */
  'scan_failures',
  /** Readings that came while this machine's clock had lost its date: believed all the same. */
  'machine_dateless',
  /** Times that this machine's clock was set. */
  'clock_set_forward',
  'clock_set_back',
  /** Times that a unit went back to before clocks of plant and machine were ahead together. */
  'clock_returns',
  /** Estimates that went with it: of the time that is still to come. */
  'estimates_taken_back',
  /** Late readings that are in their scans since; whose scan has a value; that are too old to be used. */
  'late_used',
  'late_repeated',
  'too_late',
  /** Late readings that could not be noted or taken in; they are in the journal alone. */
  'late_lost',
  /** Times that scans were made again with late readings, such scans, estimates that they changed. */
  'rewinds',
  'scans_again',
  'estimates_revised',
  /** Estimates that a damaged history had lost, and that were made again from the journal. */
  'estimates_remade',
  'rewind_failures',
  /** Times that a unit was put back to a backup, and that it failed. */
  'restores',
  'restore_failures',
  /** Backups that were no such thing, or of no use for the unit. */
  'restores_refused',
  /** Indicators that began anew at a start: what was learned as healthy for them is lost. */
  'baselines_lost',
  /** Thermocouples of all scans by what became of them, and what they are together. */
  'thermocouples',
  'thermocouples_used',
  'thermocouples_rejected',
  'thermocouples_left_out',
  'thermocouples_missing',
  /** Scans in which mode as told and flow as metered contradict each other. */
  'mode_disagreements',
  'history_failures',
  'events',
  /** Events that the history never had, since it could not be written for too long. */
  'events_lost',
  /** Events that the broker has taken as messages of their own, and tries that failed. */
  'events_told',
  'events_told_failures',
  /** Commands about alarms, over HTTP and MQTT: followed, refused; those that were no JSON. */
  'alarm_commands',
  'alarm_commands_refused',
  'alarm_commands_malformed',
  /** Answers to such commands that could not be sent. */
  'alarm_answers_lost',
  /** At its own broker: log-ins, messages and subscriptions that were refused; clients cut off. */
  'broker_logins_refused',
  'broker_publishes_refused',
  'broker_subscriptions_refused',
  'broker_packets_refused',
  'broker_connections_refused',
  'broker_handshakes_refused',
  /** There too: clients cut off as slow, and what is not kept for clients as too much is kept. */
  'broker_slow_refused',
  'broker_sessions_refused',
  'broker_retained_refused',
  'broker_queued_refused',
  /** Times that a publisher had to wait, as rockhour itself was behind. */
  'broker_publishers_held',
  /** Journal entries of a unit or channel that is no longer configured. */
  'unconfigured',
  'questions',
  'offers_kept',
  'offers_removed',
  /** Rows that went before their time, since the disk was nearly full. */
  'rows_thinned_early',
  /** Damaged files of the store that were set aside; entries that are known to be lost with a journal. */
  'stores_set_aside',
  'journal_entries_lost',
  'estimates_thinned',
  'estimates_not_forwarded',
] as const;

/** Readings that no plant produces, by the kind of their channel. */
const IMPLAUSIBLE_COUNTS = IMPLAUSIBLE_KINDS.map((kind) => `implausible_${kind}` as const);

export type CounterName =
  | (typeof OWN_COUNTS)[number]
  | (typeof IMPLAUSIBLE_COUNTS)[number]
  | (typeof INTAKE_COUNTS)[number]
  | (typeof OWN_NODE_COUNTS)[number]
  | (typeof READING_FATES)[number]
  | (typeof FORWARDER_COUNTS)[number]
  | (typeof WEBHOOK_COUNTS)[number];

const CODES = Object.keys(ERRORS) as ErrorCode[];

/** All counters by name, from 0 at the start of the process. */
export class Counters {
  private readonly counts = new Map<string, number>();
  private readonly codes = new Map<ErrorCode, number>(CODES.map((code) => [code, 0]));

  constructor() {
    for (const list of [
      INTAKE_COUNTS,
      OWN_NODE_COUNTS,
      READING_FATES,
      OWN_COUNTS,
      IMPLAUSIBLE_COUNTS,
      FORWARDER_COUNTS,
      WEBHOOK_COUNTS,
    ]) {
      for (const name of list) this.counts.set(name, 0);
    }
  }

  add(name: CounterName, by = 1): void {
    this.counts.set(name, (this.counts.get(name) ?? 0) + by);
  }

  /** Counts a failure that the daemon went on from, by its code; what has none is a fault of its own. */
  failed(thrown: unknown): void {
    const code = thrown instanceof RockhourError ? thrown.code : 'INTERNAL';
    this.codes.set(code, (this.codes.get(code) ?? 0) + 1);
  }

  /** Those failures by code, all codes. */
  errors(): Record<ErrorCode, number> {
    return Object.fromEntries(this.codes) as Record<ErrorCode, number>;
  }

  /** Adds what one scan brought and what of it was not used. */
  addScan({ stores, implausible, mode_disagrees }: ScanCounts): void {
    for (const { thermocouples, used, rejected, left_out, missing } of Object.values(stores)) {
      this.add('thermocouples', thermocouples);
      this.add('thermocouples_used', used);
      this.add('thermocouples_rejected', rejected);
      this.add('thermocouples_left_out', left_out);
      this.add('thermocouples_missing', missing);
    }
    if (mode_disagrees) this.add('mode_disagreements');
    for (const { kind } of implausible) this.add(`implausible_${kind}`);
  }

  get(name: CounterName): number {
    return this.counts.get(name) ?? 0;
  }

  all(): Record<string, number> {
    return Object.fromEntries(this.counts);
  }
}
