/**
 * What the daemon loses and doubles where all around it fails: a real daemon, mosquitto and InfluxDB
 * (behind a server with faults of its own) under load, each scenario in as many rounds as are asked.
 *
 *   npm run chaos -- [--only kill,broker,gone,hung,error,refused,disk,clock] [--rounds N] [--seed 1]
 *                    [--again]
 *
 * A line per scenario: readings in (acknowledged to the plant) and journaled; scans in, committed to the
 * history and told (stamped ahead of a clock that was set back: counted by rockhour, not used); estimates
 * forwarded to InfluxDB and refused by it for good; then lost and doubled, which have to be 0: else it
 * ends with code 1 and keeps the folder of that run. Results are kept in .chaos run by run: started again
 * it goes on where it stopped; `--again` begins anew. `--rounds` is for each scenario.
 */
import { existsSync, mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { table } from '../src/commands/table.js';
import { findProgram, PROGRAMS } from '../test/support/requirements.js';
import { addLedgers, type Ledger, NOTHING } from './chaos/ledger.js';
import { SCENARIOS, type Scenario } from './chaos/scenarios.js';

const root = fileURLToPath(new URL('..', import.meta.url));
const names = SCENARIOS.map(({ name }) => name);

const { values } = parseArgs({
  options: {
    only: { type: 'string', default: names.join(',') },
    rounds: { type: 'string' },
    seed: { type: 'string', default: '1' },
    again: { type: 'boolean', default: false },
    help: { type: 'boolean', default: false },
  },
});

if (values.help) {
  const text = readFileSync(fileURLToPath(import.meta.url), 'utf8');
  console.log(text.slice(4, text.indexOf('*/')).replace(/^ \* ?/gm, ''));
  process.exit(0);
}

function refuse(text: string): never {
  console.error(text);
  process.exit(2);
}

function whole(name: 'rounds' | 'seed'): number {
  const value = Number(values[name]);
  if (Number.isInteger(value) && value > 0) return value;
  return refuse(`--${name} must be a whole number above 0, got "${values[name]}"`);
}

const chosen = values.only.split(',').map((name) => {
  const scenario = SCENARIOS.find((one) => one.name === name);
  return scenario ?? refuse(`--only has "${name}"; known are ${names.join(', ')}`);
});
const [mosquitto, influxd] = (['mosquitto', 'influxd'] as const).map((name) => {
  return findProgram(PROGRAMS[name].names) ?? refuse(`${name} is not on this machine`);
});
const programs = { mosquitto: mosquitto!, influxd: influxd! };
const seed = whole('seed');
const folder = join(root, '.chaos');
if (values.again) rmSync(folder, { recursive: true, force: true });
mkdirSync(folder, { recursive: true });
// What a plant runs is what is built.
if (existsSync(join(root, 'dist/main.js'))) process.env.ROCKHOUR_TEST_BUILT = '1';

/** Ledgers of the runs that are done, by run. */
type Results = Record<string, { readonly rounds: number; readonly ledger: Ledger }>;

/** Runs what is not done yet. */
async function work(scenario: Scenario): Promise<{ rounds: number; ledger: Ledger }> {
  const file = join(folder, `${scenario.name}.json`);
  const results: Results = existsSync(file) ? JSON.parse(readFileSync(file, 'utf8')) : {};
  const wanted = values.rounds === undefined ? scenario.rounds : whole('rounds');
  let done = 0;
  let sum = NOTHING;
  for (let n = 0; done < wanted; n++) {
    const rounds = Math.min(scenario.per_run, wanted - done);
    const key = `seed ${seed + n}, ${rounds} rounds`;
    let result = results[key];
    if (!result) {
      const place = join(folder, `${scenario.name}-${seed + n}-${rounds}`);
      rmSync(place, { recursive: true, force: true });
      mkdirSync(place, { recursive: true });
      const ledger = await scenario.run({ programs, folder: place, rounds, seed: seed + n });
      result = { rounds, ledger };
      results[key] = result;
      writeFileSync(file, JSON.stringify(results, null, 2));
      if (isClean(ledger)) rmSync(place, { recursive: true, force: true });
      else console.error(`${scenario.name}: lost or doubled; kept for a look: ${place}`);
      console.error(`${scenario.name}: ${done + rounds} of ${wanted}`);
    }
    done += rounds;
    sum = addLedgers(sum, result.ledger);
  }
  return { rounds: done, ledger: sum };
}

function isClean({ lost, doubled }: Ledger): boolean {
  return lost === 0 && doubled === 0;
}

const COLUMNS = ['in', 'journaled', 'scans', 'committed', 'told', 'forwarded', 'refused'] as const;
const rows: string[][] = [];
let clean = true;
for (const scenario of chosen) {
  const { rounds, ledger } = await work(scenario);
  clean &&= isClean(ledger);
  const counts = [...COLUMNS, 'lost', 'doubled'] as const;
  rows.push([`${rounds} x ${scenario.round}`, ...counts.map((name) => String(ledger[name]))]);
}
console.log(table(['chaos', ...COLUMNS, 'lost', 'doubled'], rows));
process.exit(clean ? 0 : 1);
