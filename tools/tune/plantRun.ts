import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { deserialize, serialize } from 'node:v8';
import { loadSite } from '../../src/config/load.js';
import type { Direction, UnitDefinition } from '../../src/core/definitions.js';
import { createMachine } from '../../src/core/machine/machine.js';
import type { Scan } from '../../src/core/scan/scan.js';
import { DEMO_GEOMETRY } from '../../test/plant/demoGeometry.js';
import type { Segment } from '../../test/plant/truth.js';
import { createTruth } from '../../test/plant/truth.js';
import { folder, root } from '../score/folder.js';
import { hashOf } from './hash.js';
import { type PlantedStore, plantedStore } from './planted.js';

/** What was planted in one recording. */
export interface Planted {
  readonly stores: Readonly<Record<string, PlantedStore>>;
  /** ln(true/metered flow), and ln of work per metered kilogram over the model's, by direction. */
  readonly meter: number;
  readonly machine: Readonly<Record<Direction, number>>;
}

export interface PlantRun {
  readonly scans: readonly Scan[];
  readonly planted: Planted;
}

const H = 3600;
const SCAN_S = 60;
/** As of the start of this process. */
const HASH = hashOf(['test/plant', 'tools/tune', 'config/demo.yaml']);

/** Two days: full and part loads both ways, a long stand with a steep front, a night's rest. */
export function tuneSchedule(P: number): Segment[] {
  return [
    { mode: 'charge', power_W: 1.5 * P, duration_s: 6 * H },
    { mode: 'stand', duration_s: 2 * H },
    { mode: 'discharge', power_W: P, duration_s: 4 * H },
    { mode: 'stand', duration_s: 1 * H },
    { mode: 'charge', power_W: 1.2 * P, duration_s: 3.5 * H },
    { mode: 'stand', duration_s: 9 * H },
    { mode: 'discharge', power_W: 0.6 * P, duration_s: 5 * H },
    { mode: 'stand', duration_s: 1 * H },
    { mode: 'charge', power_W: 1.5 * P, duration_s: 4.5 * H },
    { mode: 'stand', duration_s: 3 * H },
    { mode: 'discharge', power_W: 0.9 * P, duration_s: 3 * H },
    { mode: 'stand', duration_s: 4 * H },
  ];
}

export const demoUnit = (): UnitDefinition => ({
  ...loadSite(join(root, 'config/demo.yaml')).units[0]!,
  scan_period_s: SCAN_S,
});

/** The recording of one seed and what was planted in it; kept on disk. */
export function plantRun(seed: number): PlantRun {
  const place = join(folder, 'tune', `runs-${HASH}`);
  mkdirSync(place, { recursive: true });
  const file = join(place, `${seed}.bin`);
  if (existsSync(file)) return deserialize(readFileSync(file)) as PlantRun;
  const made = makeRun(seed);
  writeFileSync(file, serialize(made));
  return made;
}

function makeRun(seed: number): PlantRun {
  const unit = demoUnit();
  const geometry = { ...DEMO_GEOMETRY, scan_period_s: SCAN_S };
  const plant = createTruth({ seed, geometry, resolution: { cells: 300 } });
  const machine = createMachine(unit.machine);
  const scans: Scan[] = [];
  const ratios: Record<Direction, number[]> = { charge: [], discharge: [] };
  let flow = 0;
  let meter = 0;
  let flowing = 0;
  let steady = 0;
  let before = 'stand';
  plant.run(tuneSchedule(unit.rated_power_W), (scan, truth) => {
    scans.push({
      time_ms: scan.time_s * 1000,
      values: Float64Array.from(unit.channels, (c) => scan.readings[c.id] ?? Number.NaN),
      held: new Uint8Array(unit.channels.length),
    } as Scan);
    steady = truth.mode === before ? steady + SCAN_S : 0;
    before = truth.mode;
    if (truth.flow_kg_s === 0) return;
    flow += Math.abs(truth.flow_kg_s);
    meter += Math.log(truth.meter_factor);
    flowing++;
    if (steady < 900 || truth.mode === 'stand') return;
    const out = (id: string) => truth.stores[id]!.outlet_K!;
    const work = machine.operate(
      truth.mode,
      { hot_K: out('hot'), cold_K: out('cold') },
      truth.ambient_K,
    );
    const sign = truth.mode === 'charge' ? -1 : 1;
    const gross = Math.abs(truth.power_W) + sign * machine.auxiliary_running_W;
    ratios[truth.mode].push(
      Math.log(gross / (Math.abs(truth.flow_kg_s) * truth.meter_factor * work.specificWork_J_kg)),
    );
  });
  const mean = (v: readonly number[]) => v.reduce((a, b) => a + b, 0) / v.length;
  return {
    scans,
    planted: {
      stores: Object.fromEntries(
        unit.stores.map((store, s) => [
          store.id,
          plantedStore(store, geometry.stores[s]!, plant.draw, flow / flowing),
        ]),
      ),
      meter: -meter / flowing,
      machine: { charge: mean(ratios.charge), discharge: mean(ratios.discharge) },
    },
  };
}
