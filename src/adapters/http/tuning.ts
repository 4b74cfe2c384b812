/** Bounds of the HTTP server. They protect the daemon: asking never delays a scan. */
export interface HttpTuning {
  /** Questions a minute from one address, and of these the ones that roll the stores forward. */
  readonly questions_per_min: number;
  readonly hours_per_min: number;
  /** Live streams open at the same time. */
  readonly streams_most: number;
  /** Of these with one token. */
  readonly streams_each_most: number;
  readonly heartbeat_ms: number;
  /** Shortest time between two states of one unit on the stream [ms]. */
  readonly state_every_ms: number;
  /** Events sent one by one in a second; of a storm the rest is told by number. */
  readonly events_at_once: number;
  /** Events kept for a client that comes back with Last-Event-ID. */
  readonly events_kept: number;
  /** Messages that may wait for a slow client before its stream is ended. */
  readonly waiting_most: number;
  /** Connections open at the same time; more are closed at once. */
  readonly connections_most: number;
  /** Of these from one address: nobody takes all places alone. */
  readonly connections_each_most: number;
  /** Wrong tokens a minute from one address that are answered one by one. */
  readonly wrong_tokens_per_min: number;
  /** Headers, and the whole of a question, have to be there by then [ms]. */
  readonly headers_ms: number;
  readonly request_ms: number;
  /** A connection on which nothing moves is ended [ms]: longer than the longest answer takes. */
  readonly idle_ms: number;
  /** Questions of one connection waiting for the end of their answers; one more ends it. */
  readonly waiting_each_most: number;
  /** Of answers that are not taken all together [bytes]; how long nothing may be taken of one [ms]. */
  readonly unread_most_bytes: number;
  readonly unread_ms: number;
  /** How often slow connections are looked for, and new files of the certificate [ms]. */
  readonly look_ms: number;
  readonly certificate_look_ms: number;
}

export const DEFAULT_TUNING: HttpTuning = {
  questions_per_min: 1200,
  hours_per_min: 120,
  streams_most: 64,
  streams_each_most: 48,
  heartbeat_ms: 5_000,
  state_every_ms: 250,
  events_at_once: 100,
  events_kept: 1_000,
  waiting_most: 200,
  connections_most: 512,
  connections_each_most: 256,
  wrong_tokens_per_min: 20,
  headers_ms: 10_000,
  request_ms: 30_000,
  idle_ms: 180_000,
  waiting_each_most: 4,
  unread_most_bytes: 32_000_000,
  unread_ms: 30_000,
  look_ms: 5_000,
  certificate_look_ms: 30_000,
};
