import type { Command } from 'commander';
import type { Headroom } from '../core/plan/headroom.js';
import {
  type AheadHead,
  type AheadOptions,
  aheadCommand,
  answerRecorded,
  askAhead,
  checkAheadOptions,
  headLine,
  stateFromRecording,
} from './aheadState.js';
import { firstMinutesText } from './firstMinutesText.js';
import { limitLine } from './hours.js';
import { table } from './table.js';
import { parsePowers_W } from './values.js';

interface HeadroomAnswer extends AheadHead {
  readonly answers: readonly Headroom[];
}

async function answerOf(options: AheadOptions & { power: string }): Promise<HeadroomAnswer> {
  const powers_W = parsePowers_W('--power', options.power);
  if (options.url === undefined) {
    const recorded = await stateFromRecording(options);
    const answers = answerRecorded(recorded, { kind: 'headroom', ask: { powers_W } });
    return { ...recorded.head, answers };
  }
  const power_MW = powers_W.map((power) => power / 1e6).join(',');
  return (await askAhead(options, 'headroom', { power_MW })) as HeadroomAnswer;
}

function text(answer: HeadroomAnswer): string {
  const three = ({ p90, p50, p10 }: Headroom['hours']) => [p90, p50, p10].map((x) => x.toFixed(2));
  const rows = answer.answers.map((one) => [
    one.power_MW_el,
    ...three(one.hours),
    ...three(one.energy_MWh_el),
    one.refused ?? one.ends_by ?? 'nothing within the time looked ahead',
  ]);
  const header = ['MW_el', 'h p90', 'h p50', 'h p10', 'MWh_el p90', 'MWh_el p50', 'MWh_el p10'];
  return [
    headLine(answer),
    'Charging from now, hours and MWh_el it can still take:',
    table([...header, 'ends by'], rows),
    ...answer.answers.flatMap(({ power_MW_el, refused, limited_by }) =>
      limited_by === null || refused !== null ? [] : [limitLine(power_MW_el, 'taken', limited_by)],
    ),
    ...answer.answers.flatMap(({ power_MW_el, first_minutes }) =>
      first_minutes === undefined
        ? []
        : [`${power_MW_el} MW_el: ${firstMinutesText(first_minutes, 'taken')}.`],
    ),
    ...answer.answers.flatMap(deratedLine),
    'p90 is the firm figure: exceeded with 90 % probability.',
  ].join('\n');
}

function deratedLine({ power_MW_el, derated_after_hours, derated_to_MW_el }: Headroom): string[] {
  if (derated_after_hours === null || derated_to_MW_el === null) return [];
  const [hours, to] = [derated_after_hours.toFixed(2), derated_to_MW_el.toFixed(2)];
  return [
    `${power_MW_el} MW_el need more than the greatest flow after ${hours} h (p50): it takes less, down to ${to} MW_el.`,
  ];
}

async function headroom(options: AheadOptions & { power: string }): Promise<void> {
  checkAheadOptions('headroom', options);
  const answer = await answerOf(options);
  process.stdout.write(`${options.json ? JSON.stringify(answer) : text(answer)}\n`);
}

export function register(program: Command): void {
  aheadCommand(
    program,
    'headroom',
    'hours and MWh_el that a unit can still take at given charging powers',
  )
    .requiredOption('--power <MW>', 'charging powers, such as 2.4,3.6')
    .option('--json', 'answer as one line of JSON')
    .action(headroom);
}
