import type { Command } from 'commander';
import { type OfferTable, offerTable } from '../core/plan/offerTable.js';
import { offersAskOf } from '../core/plan/offerWords.js';
import { RockhourError, reasonOf } from '../errors.js';
import {
  type AheadHead,
  aheadCommand,
  answerRecorded,
  askAhead,
  checkAheadOptions,
  headLine,
  type RecordedState,
  stateFromRecording,
} from './aheadState.js';
import { type OffersOptions, writtenAsk } from './offers/question.js';
import { reportText } from './offers/report.js';
import { offersText } from './offers/text.js';

type OffersAnswer = AheadHead & OfferTable & { readonly kept?: number | null };

async function answerOf(options: OffersOptions): Promise<OffersAnswer> {
  const written = writtenAsk(options);
  if (options.url !== undefined) {
    const body = {
      ...written,
      keep: options.keep === true,
      ...(options.stale === undefined ? {} : { stale: options.stale }),
    };
    return (await askAhead(options, 'offers', {}, body)) as OffersAnswer;
  }
  if (options.keep) {
    throw new RockhourError('USAGE', '--keep goes with --url: a daemon keeps offers');
  }
  return fromRecorded(await stateFromRecording(options), written);
}

function fromRecorded(
  recorded: RecordedState,
  written: ReturnType<typeof writtenAsk>,
): OffersAnswer {
  const { unit, head } = recorded;
  const now_ms = Date.parse(head.time);
  const asked_ms = now_ms + (head.age_s ?? 0) * 1000;
  let ask: ReturnType<typeof offersAskOf>;
  try {
    ask = offersAskOf(unit, written, now_ms, asked_ms);
  } catch (thrown) {
    if (!(thrown instanceof RangeError)) throw thrown;
    throw new RockhourError('USAGE', reasonOf(thrown), { cause: thrown });
  }
  const offers = answerRecorded(recorded, { kind: 'offers', ask });
  const zone = unit.limits.connection?.time_zone ?? null;
  return { ...head, ...offerTable(offers, ask, now_ms, zone) };
}

async function offers(options: OffersOptions): Promise<void> {
  if (options.report) {
    process.stdout.write(`${await reportText(options)}\n`);
    return;
  }
  checkAheadOptions('offers', options);
  const answer = await answerOf(options);
  if (options.json) {
    process.stdout.write(`${JSON.stringify(answer)}\n`);
    return;
  }
  const kept = typeof answer.kept === 'number' ? [`Kept as number ${answer.kept}.`] : [];
  const given = answer.given === undefined ? [] : [`Given that ${answer.given}.`];
  const text = offersText(answer, options.blocks === true);
  const lines = [headLine(answer), ...text, ...given, ...kept];
  process.stdout.write(`${lines.join('\n')}\n`);
}

export function register(program: Command): void {
  aheadCommand(
    program,
    'offers',
    'what a unit can sell: MWh_el per power, start and block at any certainty',
  )
    .option('--power <MW>', 'discharging powers, such as 1.2,1.8')
    .option('--start <times>', 'when discharges begin, ISO 8601, separated by commas; else a gate')
    .option('--closes-before <span>', 'from now until delivery may begin, such as 60min; 0 = now')
    .option('--count <n>', 'how many starts from then on (default: 1)')
    .option('--every <span>', 'from one start to the next (default: a block)')
    .option('--block <span>', 'length of a block: 15min, 30min or 60min', '15min')
    .option('--certainty <shares>', 'such as 0.5,0.9 (default: 0.5,0.75,0.9,0.95)')
    .option('--plan <file>', 'what it does until then: CSV with from,to,mode,power_MW_el')
    .option('--horizon <span>', 'longest discharge that is offered, such as 6h')
    .option('--shortfall <cost>', 'cost of each MWh_el missing beyond its price; with --surplus')
    .option('--surplus <cost>', 'price of each MWh_el not sold less its worth kept')
    .option('--blocks', 'block by block too')
    .option('--keep', 'with --url: keep the table for good')
    .option('--report', 'with --url: past p90 and p50 against what was then delivered')
    .option('--from <time>', 'of a report: offers asked from then on (default: 30 days back)')
    .option('--to <time>', 'of a report: until then')
    .option('--json', 'answer as one line of JSON')
    .action(offers);
}
