import type { SensorVerdict } from '../estimate.js';
import { isBelieved, rename, type SensorEvidence, type SensorMemory } from './judgeMemory.js';
import { isMovementKnown, isNoOffset, mirrored, misreadTypes } from './judgeMovement.js';

/** Verdicts whose cause shows only where the rock moves: they end only there, too. */
export const WIRING: readonly (SensorVerdict | null)[] = ['reversed', 'swapped', 'wrong_type'];

/** Scans in a row that show a wiring fault before it is named. */
const MISWIRED_SCANS = 3;

/** How long what is called a drift may yet turn out to be reversed wires by its movement. */
const DRIFT_MS = 3600_000;

/**
 * Wiring faults also take the place of a verdict that was given for their first appearance.
 * @returns true where the reading may already be one of them: it is not to be used
 */
export function judgeWiring(
  memory: SensorMemory,
  evidence: SensorEvidence,
  innovation: number,
): boolean {
  const { verdict } = memory;
  const open = isBelieved(memory) || verdict === 'offset' || verdict === 'drifting';
  if (!open && verdict !== 'burst' && verdict !== 'uncovered') return false;
  const { value_K: value, predicted_K: rock, sigma_K: sigma, time_ms } = evidence;
  // A drift that goes on may run against the rock by chance.
  const slow = verdict === 'drifting' && memory.beyond_s > 0;
  const moving =
    (!slow || time_ms - memory.since_ms < DRIFT_MS) && isMovementKnown(memory, time_ms);
  const noise = evidence.noiseSigma_K ?? 0;
  const mirror = mirrored(
    memory,
    value,
    rock,
    evidence.deadband_K,
    sigma,
    noise,
    moving,
    verdict === 'drifting',
  );
  memory.miswired = mirror === 'yes' ? memory.miswired + 1 : 0;
  const shown = `reads ${(value - 273.15).toFixed(1)} degC where the rock is at ${(rock - 273.15).toFixed(1)} degC`;
  if (memory.miswired >= MISWIRED_SCANS) {
    const text = `${shown}: mirrored about its cold junction`;
    rename(memory, 'reversed', time_ms, text, innovation);
  }
  if (mirror !== 'no') return true;
  // Nor is a rock that is not yet known any evidence of another table.
  const types = evidence.guessed ? null : misreadTypes(value, rock, sigma);
  if (types === null) memory.firstRock_K = Number.NaN;
  else if (Number.isNaN(memory.firstRock_K)) {
    memory.firstRock_K = rock;
    memory.firstRead_K = value;
  } else if (isNoOffset(memory, value, rock, sigma)) {
    const text = `${shown}: as type ${types[0]} read by the table of type ${types[1]}`;
    rename(memory, 'wrong_type', time_ms, text, innovation);
  }
  return false;
}
