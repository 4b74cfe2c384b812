import { readFileSync } from 'node:fs';
import type { Mode } from '../../core/definitions.js';
import { USUAL_CERTAINTIES, type WrittenOffersAsk } from '../../core/plan/offerWords.js';
import { readScheduleCsv } from '../../core/plan/scheduleCsv.js';
import { fileReasonOf, RockhourError } from '../../errors.js';
import type { AheadOptions } from '../aheadState.js';
import { parseDuration_s, parsePowers_W } from '../values.js';

export interface OffersOptions extends AheadOptions {
  readonly power?: string;
  readonly start?: string;
  readonly closesBefore?: string;
  readonly count?: string;
  readonly every?: string;
  readonly block: string;
  readonly certainty?: string;
  readonly plan?: string;
  readonly horizon?: string;
  readonly shortfall?: string;
  readonly surplus?: string;
  readonly blocks?: boolean;
  readonly keep?: boolean;
  readonly report?: boolean;
  readonly from?: string;
  readonly to?: string;
}

const MODES: readonly Mode[] = ['charge', 'discharge', 'stand'];

/** @throws RockhourError USAGE where an option is not what it should be */
export function writtenAsk(options: OffersOptions): WrittenOffersAsk {
  const { power, start, certainty, horizon, shortfall, surplus, plan } = options;
  if (power === undefined) throw usage('offers needs --power, such as --power 1.2,1.8');
  const minutes = (option: string, text: string): number => parseDuration_s(option, text) / 60;
  const gated = (options.closesBefore ?? options.count ?? options.every) !== undefined;
  const priced = (shortfall ?? surplus) !== undefined;
  const closes = options.closesBefore ?? '0';
  if (gated && start !== undefined) {
    const beside = 'none beside --closes-before, --count or --every';
    throw usage(`--start is ${JSON.stringify(start)}; expected ${beside}`);
  }
  if (priced && (shortfall === undefined || surplus === undefined)) {
    const missing = shortfall === undefined ? '--shortfall' : '--surplus';
    throw usage(`${missing} is missing; expected a number above 0 per MWh_el: both prices or none`);
  }
  return {
    powers_MW_el: parsePowers_W('--power', power).map((power_W) => power_W / 1e6),
    ...(start === undefined ? {} : { starts: start.split(',').map((text) => text.trim()) }),
    ...(start === undefined
      ? {
          gate: {
            closes_before_min: closes === '0' ? 0 : minutes('--closes-before', closes),
            count: options.count === undefined ? 1 : numberOf('--count', options.count),
            ...(options.every === undefined
              ? {}
              : { every_min: minutes('--every', options.every) }),
          },
        }
      : {}),
    block_min: minutes('--block', options.block),
    certainties:
      certainty === undefined
        ? USUAL_CERTAINTIES
        : certainty.split(',').map((text) => numberOf('--certainty', text)),
    plan: plan === undefined ? [] : planOf(plan),
    ...(horizon === undefined ? {} : { horizon_h: parseDuration_s('--horizon', horizon) / 3600 }),
    ...(priced
      ? {
          prices: {
            shortfall_per_MWh_el: numberOf('--shortfall', shortfall ?? ''),
            surplus_per_MWh_el: numberOf('--surplus', surplus ?? ''),
          },
        }
      : {}),
  };
}

function numberOf(option: string, text: string): number {
  const value = text.trim() === '' ? Number.NaN : Number(text);
  if (Number.isFinite(value)) return value;
  throw usage(`${option} is ${JSON.stringify(text)}; expected a number`);
}

/** The plan until the start: CSV with the columns from,to,mode,power_MW_el. */
function planOf(file: string): WrittenOffersAsk['plan'] {
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (thrown) {
    throw new RockhourError('USAGE', `--plan ${file}: ${fileReasonOf(thrown)}`, { cause: thrown });
  }
  const read = readScheduleCsv(text);
  if ('faults' in read) {
    const said = read.faults.map(
      ({ field, value, expected }) => `${field} is ${JSON.stringify(value)}; expected ${expected}`,
    );
    throw usage(`--plan ${file}: ${said.join('; ')}`);
  }
  return read.blocks.map(({ mode, power_MW_el, from, to }, i) => {
    const row = `--plan ${file}: row ${read.rows[i]}`;
    const known = MODES.find((one) => one === mode);
    if (known === undefined) {
      throw usage(`${row} mode is ${JSON.stringify(mode)}; expected one of ${MODES.join(', ')}`);
    }
    const power = String(power_MW_el ?? '');
    return {
      mode: known,
      power_MW_el: power === '' ? 0 : numberOf(`${row} power_MW_el`, power),
      from: String(from),
      to: String(to),
    };
  });
}

function usage(message: string): RockhourError {
  return new RockhourError('USAGE', message);
}
