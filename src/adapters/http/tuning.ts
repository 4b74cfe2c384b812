/** Bounds of the HTTP server. They protect the daemon: asking never delays a scan. */
export interface HttpTuning {
  /** Questions a minute from one address, and of these the ones that roll the stores forward. */
  readonly questions_per_min: number;
  readonly hours_per_min: number;
  /** Live streams open at the same time. */
  readonly streams_most: number;
  readonly heartbeat_ms: number;
  /** Shortest time between two states of one unit on the stream [ms]. */
  readonly state_every_ms: number;
  /** Events sent one by one in a second; of a storm the rest is told by number. */
  readonly events_at_once: number;
  /** Events kept for a client that comes back with Last-Event-ID. */
  readonly events_kept: number;
  /** Messages that may wait for a slow client before its stream is ended. */
  readonly waiting_most: number;
}

export const DEFAULT_TUNING: HttpTuning = {
  questions_per_min: 1200,
  hours_per_min: 120,
  streams_most: 64,
  heartbeat_ms: 5_000,
  state_every_ms: 250,
  events_at_once: 100,
  events_kept: 1_000,
  waiting_most: 200,
};
