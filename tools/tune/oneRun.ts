import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { finishThinning, startThinning, thin } from '../../src/core/tune/record.js';
import type { TuneRow } from '../../src/core/tune/result.js';
import { tuneUnit } from '../../src/core/tune/tune.js';
import { unitModel } from '../../src/core/unitModel.js';
import { folder } from '../score/folder.js';
import { hashOf } from './hash.js';
import { demoUnit, type Planted, plantRun } from './plantRun.js';

/** One value of one run beside what was planted; both ln for factors, as they are for shares. */
export interface Compared {
  readonly name: string;
  readonly told: number;
  readonly sigma: number;
  readonly planted: number;
  readonly determined: boolean;
}

export interface OneRun {
  readonly seed: number;
  readonly seconds: number;
  readonly converged: boolean;
  readonly leftOut: readonly string[];
  readonly compared: readonly Compared[];
}

/** What a result depends on, as of the start of this process. */
const HASH = hashOf([
  'src/core/bed',
  'src/core/machine',
  'src/core/tune',
  'src/core/track/conditions.ts',
  'config/demo.yaml',
  'test/plant',
  'tools/tune',
]);

/** What `tune` makes of a seed's recording; kept on disk until anything of it changes. */
export function oneRun(seed: number): OneRun {
  const place = join(folder, 'tune', `results-${HASH}`);
  mkdirSync(place, { recursive: true });
  const file = join(place, `${seed}.json`);
  if (existsSync(file)) return JSON.parse(readFileSync(file, 'utf8')) as OneRun;
  const run = plantRun(seed);
  const model = unitModel(demoUnit());
  const started = performance.now();
  const thinning = startThinning(model);
  for (const scan of run.scans) thin(thinning, scan);
  const answer = tuneUnit(model, finishThinning(thinning));
  if ('refusal' in answer) throw new Error(`seed ${seed}: ${answer.refusal}`);
  const { result } = answer;
  const made: OneRun = {
    seed,
    seconds: (performance.now() - started) / 1000,
    converged: result.fits.every((fit) => fit.converged),
    leftOut: result.fits.flatMap((fit) => fit.left_out.map(({ id }) => id)),
    compared: result.rows.flatMap((row) => compare(row, run.planted)),
  };
  writeFileSync(file, JSON.stringify(made));
  return made;
}

function compare(row: TuneRow, planted: Planted): Compared[] {
  const value = plantedOf(row, planted);
  if (row.sigma === null || value === null) return [];
  return [
    {
      name: row.store === null ? row.name : `${row.store} ${row.name}`,
      told: row.name === 'gas_share' ? row.value : Math.log(row.value),
      sigma: row.sigma,
      planted: value,
      determined: row.determined,
    },
  ];
}

/** Factors are told on the configuration, whose own factors are all 1 here. */
function plantedOf(row: TuneRow, planted: Planted): number | null {
  const store = row.store === null ? null : planted.stores[row.store]!;
  switch (row.name) {
    case 'true_over_metered_flow':
      return planted.meter;
    case 'work_charge':
      return planted.machine.charge;
    case 'work_discharge':
      return planted.machine.discharge;
    case 'heat_transfer':
      return store!.transfer;
    case 'conductivity':
      return store!.conductivity;
    case 'loss':
      return store!.loss;
    case 'heat_capacity':
      return store!.capacity;
    case 'gas_share':
      return store!.share;
    case 'front_travel':
      return planted.meter - store!.capacity;
  }
}
