import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { writtenAsk } from '../../src/commands/offers/question.js';
import { loadSite } from '../../src/config/load.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { START_MS, writeSynthetic } from './synthetic.js';

const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('offers');
const recording = join(folder, 'run.csv');
const plan = join(folder, 'plan.csv');

/** 2025-03-01T07:00 in Berlin; the recording ends ten minutes later. */
const LATER = new Date(START_MS + 2 * 3_600_000).toISOString();

beforeAll(async () => {
  await writeSynthetic(recording, loadSite(CONFIG).units[0]!, { rows: 20 });
  writeFileSync(
    plan,
    'from,to,mode,power_MW_el\n2025-03-01T06:15:00Z,2025-03-01T07:15:00Z,charge,2.4\n',
  );
});

async function offers(...options: string[]) {
  return rockhour(['offers', '--config', CONFIG, '--recording', recording, ...options]);
}

describe('rockhour offers', () => {
  it('gives JSON from a recording, after a plan, with the bid that prices make worth it', async () => {
    const { stdout, code } = await offers(
      ...['--power', '1,1.8', '--start', LATER, '--plan', plan, '--block', '30min', '--json'],
      ...['--certainty', '0.5,0.9', '--shortfall', '90', '--surplus', '30', '--horizon', '2h'],
    );
    expect(code).toBe(0);
    const answer = JSON.parse(stdout);
    expect(answer).toMatchObject({ unit: 'vellmoor', block_s: 1800, time_zone: 'Europe/Berlin' });
    expect(answer.given).toContain('the machine runs');
    const [first] = answer.offers;
    expect(first).toMatchObject({
      ...{ power_MW_el: 1, start: '2025-03-01T09:00:00+01:00', refused: null },
      bid: { certainty: 0.75 },
    });
    // Two hours, and the ramp down in a block of its own.
    expect(first.blocks.length).toBeLessThanOrEqual(5);
  });

  it('names what is wrong with a question and what would be right', async () => {
    const past = await offers('--power', '1', '--start', '2025-03-01T05:00:00Z');
    expect(past.stderr).toContain(
      'starts.0 = "2025-03-01T06:00:00+01:00": expected 2025-03-01T07:',
    );
    expect(past.code).toBe(2);
    const block = await offers('--power', '1', '--block', '20min');
    expect(block.stderr).toContain('block_min = 20: expected 15, 30 or 60');
    const kept = await offers('--power', '1', '--keep');
    expect(kept.stderr).toContain('--keep goes with --url');
  });
});

describe('the options of rockhour offers', () => {
  const usual = { power: '1.8', block: '15min' };

  it('are the question of the HTTP API', () => {
    expect(writtenAsk({ ...usual, closesBefore: '60min', count: '4', every: '1h' })).toEqual({
      powers_MW_el: [1.8],
      gate: { closes_before_min: 60, count: 4, every_min: 60 },
      block_min: 15,
      certainties: [0.5, 0.75, 0.9, 0.95],
      plan: [],
    });
    // Nothing said of the start: the next block.
    expect(writtenAsk(usual).gate).toEqual({ closes_before_min: 0, count: 1 });
    expect(writtenAsk({ ...usual, plan }).plan).toEqual([
      {
        ...{ mode: 'charge', power_MW_el: 2.4 },
        ...{ from: '2025-03-01T06:15:00Z', to: '2025-03-01T07:15:00Z' },
      },
    ]);
  });

  it.each([
    [{ power: '-1' }, '--power is "-1"; expected powers in MW above 0'],
    [{ certainty: '0.9,x' }, '--certainty is "x"; expected a number'],
    [
      { shortfall: '90' },
      '--surplus is missing; expected a number above 0 per MWh_el: both prices',
    ],
    [{ surplus: '90' }, '--shortfall is missing; '],
    [{ surplus: '90', shortfall: 'x' }, '--shortfall is "x"; expected a number'],
    [{ start: LATER, count: '5' }, '"; expected none beside --closes-before, --count or --every'],
    [{ horizon: 'long' }, '--horizon is "long"; expected a time span'],
    [{ plan: join(folder, 'none.csv') }, 'none.csv: '],
  ])('%j are refused in words', (over, said) => {
    expect(() => writtenAsk({ ...usual, ...over })).toThrow(said);
  });

  it('refuse a plan that is not one', () => {
    const wrong = join(folder, 'wrong.csv');
    writeFileSync(wrong, 'from,to,mode\n2025-03-01T06:15:00Z,2025-03-01T07:15:00Z,run\n');
    expect(() => writtenAsk({ ...usual, plan: wrong })).toThrow(
      /row 2 mode is "run"; expected one/,
    );
    writeFileSync(wrong, 'a,b\n1,2\n');
    expect(() => writtenAsk({ ...usual, plan: wrong })).toThrow(/row 1 is "a,b"; expected the col/);
  });
});
