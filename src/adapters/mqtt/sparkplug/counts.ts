/**
 * What becomes of a message of an edge node: each is counted as one of these.
 */
export const SPARKPLUG_FATES = [
  'sparkplug_births',
  'sparkplug_data',
  'sparkplug_deaths',
  /** No Sparkplug B payload, or an empty one. */
  'sparkplug_garbled',
  /** Longer, or of more metrics, than is looked at. */
  'sparkplug_too_large',
  /** Kept by the broker, which Sparkplug forbids: what it tells is of another time. */
  'sparkplug_retained',
  /** Data, or a device's birth or death, of whom no birth is known. */
  'sparkplug_before_birth',
  'sparkplug_after_death',
  /** The death of a connection that is not the running one, by its bdSeq. */
  'sparkplug_foreign_deaths',
] as const;
export type SparkplugFate = (typeof SPARKPLUG_FATES)[number];

export const SPARKPLUG_COUNTS = [
  ...SPARKPLUG_FATES,
  /** A message whose sequence number is not the next: messages between were lost. */
  'sparkplug_seq_gaps',
  /** A value by an alias that no birth told. */
  'sparkplug_unknown_aliases',
  /** A configured metric that a birth does not name: its channel is missing. */
  'sparkplug_not_in_birth',
  /** Metrics that no channel is configured for; they are let pass. */
  'sparkplug_unused_metrics',
  /** Channels made missing by a death, by a lost connection or at a start. */
  'sparkplug_made_missing',
  'sparkplug_rebirth_requests',
  /** Edge nodes taken for dead, as they were not heard after a loss of the broker. */
  'sparkplug_unheard_nodes',
] as const;
export type SparkplugCount = (typeof SPARKPLUG_COUNTS)[number];
