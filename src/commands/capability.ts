import type { Command } from 'commander';
import type { Capability, CapabilityCurve } from '../core/plan/capability.js';
import { RockhourError } from '../errors.js';
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
import { table } from './table.js';

type CapabilityAnswer = AheadHead & Capability;
type CapabilityOptions = AheadOptions & { readonly tolerance?: string };

async function answerOf(options: CapabilityOptions): Promise<CapabilityAnswer> {
  const { tolerance: text } = options;
  const tolerance = text === undefined ? undefined : Number(text);
  if (tolerance !== undefined && !(tolerance >= 0.0005 && tolerance <= 0.2)) {
    throw new RockhourError(
      'USAGE',
      `--tolerance is ${JSON.stringify(text)}; expected a share of rated power from 0.0005 to 0.2, such as 0.01`,
    );
  }
  if (options.url !== undefined) {
    const asked = { tolerance: tolerance?.toString() };
    return (await askAhead(options, 'capability', asked)) as CapabilityAnswer;
  }
  const recorded = await stateFromRecording(options);
  const ask = tolerance === undefined ? {} : { tolerance };
  return { ...recorded.head, ...answerRecorded(recorded, { kind: 'capability', ask }) };
}

const percent = (share: number): string => `${(share * 100).toFixed(1)} %`;

function curveText(curve: CapabilityCurve): string[] {
  const { direction, refused, points, ends_by, after_cycles, beyond_MWh_el } = curve;
  const title = direction === 'charge' ? 'Charging' : 'Discharging';
  if (refused !== null) return ['', `${title}: refused, ${refused}`];
  const stores = Object.keys(points[0]?.stored_MWh_th ?? {});
  const header = [
    'state of charge %',
    'MW_el',
    'limited by',
    direction === 'charge' ? 'MWh_el to full' : 'MWh_el left',
    ...stores.map((id) => `${id} MWh_th`),
  ];
  const rows = points.map((point) => [
    (point.state_of_charge * 100).toFixed(1),
    point.power_MW_el.toFixed(3),
    point.limited_by,
    point.energy_MWh_el.toFixed(2),
    ...stores.map((id) => (point.stored_MWh_th[id] ?? Number.NaN).toFixed(2)),
  ]);
  const error = `largest error ${curve.largest_error_MW_el.toFixed(4)} MW_el over ${curve.steps} steps`;
  const after =
    after_cycles === null
      ? ' in a settled cycle (the present beds cannot be moved)'
      : after_cycles > 0
        ? `, of cycle ${after_cycles} from now`
        : '';
  const beyond =
    beyond_MWh_el > 0
      ? [`Below rated power it gives ${beyond_MWh_el.toFixed(2)} MWh_el more past 0.`]
      : [];
  return [
    '',
    `${title} at most${after}; ends by ${ends_by ?? 'nothing within the time looked ahead'}; ${error}:`,
    table(header, rows),
    ...beyond,
  ];
}

function text(answer: CapabilityAnswer): string {
  const { cycle } = answer;
  const lines = [
    `${headLine(answer)}, state of charge ${percent(answer.state_of_charge)}`,
    `A charge from now ends at ${percent(answer.full_from_now)} of ${answer.rated_power_MW_el} MW_el for ${answer.rated_hours} h.`,
    ...curveText(answer.discharge),
    ...curveText(answer.charge),
  ];
  if (cycle === null) return lines.join('\n');
  const rows = Object.keys(cycle.charge_MWh_el_per_MWh_th).map((id) => [
    id,
    (cycle.charge_MWh_el_per_MWh_th[id] as number).toFixed(3),
    (cycle.discharge_MWh_el_per_MWh_th[id] as number).toFixed(3),
  ]);
  return [
    ...lines,
    '',
    `Cycle ${cycle.cycles} from now${cycle.settled ? ', settled' : ', not settled yet'}: takes ${cycle.charge_MWh_el.toFixed(2)} MWh_el, gives ${cycle.discharge_MWh_el.toFixed(2)} MWh_el, round trip ${percent(cycle.round_trip)}.`,
    table(['store', 'taken MWh_el/MWh_th', 'given MWh_el/MWh_th'], rows),
    'Straight lines run between the points; windows of the connection and outages are not in them.',
  ].join('\n');
}

async function capability(options: CapabilityOptions): Promise<void> {
  checkAheadOptions('capability', options);
  const answer = await answerOf(options);
  process.stdout.write(`${options.json ? JSON.stringify(answer) : text(answer)}\n`);
}

export function register(program: Command): void {
  aheadCommand(
    program,
    'capability',
    'greatest power in both directions against state of charge, for an optimiser',
  )
    .option('--tolerance <share>', 'largest error of the curves over rated power (default 0.01)')
    .option('--json', 'answer as one line of JSON')
    .action(capability);
}
