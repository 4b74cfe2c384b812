import type { IndicatorView } from './indicator.js';

/** What may be behind what the indicators show. */
export const CAUSE_KINDS = [
  'dust_or_fines',
  'frost',
  'channelling',
  'flow_meter',
  'insulation',
  'valve',
  'settled_bed',
  'machine',
  'gas_loss',
  'thermocouples',
  'store_mismatch',
] as const;
export type CauseKind = (typeof CAUSE_KINDS)[number];

export interface CauseView {
  readonly cause: CauseKind;
  /** Store or unit. */
  readonly subject: string;
  /** Of all explanations looked at, 0..1. */
  readonly probability: number;
  /** What speaks for it and against it, each a plain sentence. */
  readonly evidence: readonly string[];
  /** What to look at on site. */
  readonly check: string;
}

/** What a unit's indicators show, and what is probably behind it. */
export interface WatchView {
  readonly time: string;
  readonly unit: string;
  readonly indicators: readonly IndicatorView[];
  /** Most probable first; empty while nothing is degraded. */
  readonly causes: readonly CauseView[];
}

/** Explanations of what is degraded, most probable first; empty while nothing is. */
export function causesOf(_views: readonly IndicatorView[]): CauseView[] {
  return [];
}
