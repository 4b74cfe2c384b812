/**
 * What sigma is made of, beside what the estimate is wrong by: state of charge and hours at 60 % power
 * of one row of the score, over tuning seeds.
 *
 *   npx tsx tools/sigma.ts nominal all-independent 1 8
 *
 * scenario, row, first and last seed; `--from 9` starts the estimator at that hour of the recording,
 * in the middle of a course; `--every 12` looks at every twelfth hour alone; `--charge` leaves the
 * hours out; `--json` prints every time that was looked at instead. `--without gain,group` takes errors
 * out of the readings (offset, gain, group, gas: tools/sigma/without.ts). Truths are those of
 * `npm run score`, made where they are missing. Parts of sigma by cause are each taken alone
 * (tools/sigma/causes.ts); ratios have the interval in which 90 of 100 draws of so many seeds, with
 * replacement, fall.
 */
import { parseArgs } from 'node:util';
import { helpIfAsked } from './help.js';
import { truthHash } from './score/codeHash.js';
import { SCENARIOS } from './score/scenarios.js';
import { looksAt } from './sigma/look.js';
import { report } from './sigma/report.js';
import { ERRORS } from './sigma/without.js';

helpIfAsked(import.meta.url);

const { values, positionals } = parseArgs({
  allowPositionals: true,
  options: {
    json: { type: 'boolean', default: false },
    charge: { type: 'boolean', default: false },
    from: { type: 'string', default: '0' },
    every: { type: 'string', default: '1' },
    without: { type: 'string', default: '' },
  },
});
const [id, rowId, first = '1', last = '8'] = positionals;
const scenario = SCENARIOS.find((s) => s.id === id);
const row = scenario?.rows.find((r) => r.id === rowId);
if (!scenario || !row) {
  const known = SCENARIOS.map((s) => `${s.id} (${s.rows.map((r) => r.id).join(', ')})`);
  console.error(`expected a scenario and a row of it: ${known.join('; ')}`);
  process.exit(2);
}
const named = values.without.split(',').filter((name) => name !== '');
const without = new Set(ERRORS.filter((e) => named.includes(e)));
if (without.size < new Set(named).size) {
  console.error(`--without: expected some of ${ERRORS.join(', ')}, got ${values.without}`);
  process.exit(2);
}
const hash = await truthHash();
const options = {
  from_h: Number(values.from),
  every_h: Number(values.every),
  hours: !values.charge,
  without,
};
const looks = [];
for (let seed = Number(first); seed <= Number(last); seed++) {
  const found = looksAt(scenario, row, seed, hash, options);
  if (values.json) for (const look of found) console.log(JSON.stringify(look));
  looks.push(...found);
}
if (!values.json) console.log(report(looks));
