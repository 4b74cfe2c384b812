import type { Command } from 'commander';
import type { UnitDefinition } from '../core/definitions.js';
import type { Balance, BalanceAsk } from '../core/plan/balance.js';
import { RockhourError } from '../errors.js';
import {
  type AheadHead,
  type AheadOptions,
  aheadCommand,
  answerRecorded,
  askAhead,
  checkAheadOptions,
  stateFromRecording,
} from './aheadState.js';
import { balanceText } from './balance/text.js';

interface BalanceOptions extends AheadOptions {
  readonly power?: string;
  readonly charge?: string;
  readonly price?: string;
  readonly chargingPrice?: string;
}

/** A number of the command line, undefined where it is not given. */
function numeral(
  option: string,
  text: string | undefined,
  least: 'above 0' | '0 or more' | 'of any sign',
) {
  if (text === undefined) return undefined;
  const value = text.trim() === '' ? Number.NaN : Number(text);
  const enough = least === 'above 0' ? value > 0 : least === 'of any sign' || value >= 0;
  if (Number.isFinite(value) && enough) return value;
  throw new RockhourError(
    'USAGE',
    `${option} is ${JSON.stringify(text)}; expected a number, ${least}`,
  );
}

/** @throws RockhourError USAGE for a power that the unit does not discharge at */
function checkPower({ limits }: UnitDefinition, power_MW: number | undefined): void {
  const [least, most] = [limits.discharge.power_min_W / 1e6, limits.discharge.power_max_W / 1e6];
  if (power_MW === undefined || (power_MW >= least && power_MW <= most)) return;
  throw new RockhourError(
    'USAGE',
    `--power is ${power_MW}; expected ${least} to ${most} MW, as the unit discharges`,
  );
}

async function answerOf(options: BalanceOptions): Promise<AheadHead & Balance> {
  const power_MW = numeral('--power', options.power, 'above 0');
  const charge_MWh_el = numeral('--charge', options.charge, 'above 0');
  const price = numeral('--price', options.price, '0 or more');
  const charging = numeral('--charging-price', options.chargingPrice, 'of any sign');
  if (charging !== undefined && price === undefined) {
    throw new RockhourError('USAGE', '--charging-price goes with --price, of energy given');
  }
  if (options.url !== undefined) {
    const query = {
      power_MW: power_MW?.toString(),
      charge_MWh_el: charge_MWh_el?.toString(),
      price_per_MWh_el: price?.toString(),
      charging_price_per_MWh_el: charging?.toString(),
    };
    return (await askAhead(options, 'balance', query)) as AheadHead & Balance;
  }
  const recorded = await stateFromRecording(options);
  checkPower(recorded.unit, power_MW);
  const ask: BalanceAsk = {
    ...(power_MW === undefined ? {} : { power_W: power_MW * 1e6 }),
    ...(charge_MWh_el === undefined ? {} : { charge_J: charge_MWh_el * 3.6e9 }),
    ...(price === undefined
      ? {}
      : {
          prices: {
            price_per_MWh_el: price,
            ...(charging === undefined ? {} : { charging_price_per_MWh_el: charging }),
          },
        }),
  };
  return { ...recorded.head, ...answerRecorded(recorded, { kind: 'balance', ask }) };
}

async function balance(options: BalanceOptions): Promise<void> {
  checkAheadOptions('balance', options);
  const answer = await answerOf(options);
  process.stdout.write(`${options.json ? JSON.stringify(answer) : balanceText(answer)}\n`);
}

export function register(program: Command): void {
  aheadCommand(
    program,
    'balance',
    'what flushing the fronts would win back, and how the two stores match',
  )
    .option('--power <MW>', 'power of the discharge (default: rated)')
    .option('--charge <MWh>', 'MWh_el that a usual charge takes (default: for the rated energy)')
    .option('--price <number>', 'price of energy given per MWh_el; without it MWh_el alone')
    .option(
      '--charging-price <number>',
      'price of energy taken per MWh_el, may be below 0 (default: the same)',
    )
    .option('--json', 'answer as one line of JSON')
    .action(balance);
}
