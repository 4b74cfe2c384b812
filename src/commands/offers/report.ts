import { RockhourError } from '../../errors.js';
import { askAhead } from '../aheadState.js';
import { table } from '../table.js';
import type { OffersOptions } from './question.js';

interface Kept {
  readonly kept: number;
  readonly of: number;
  readonly meant: number;
  readonly share: number | null;
  readonly interval: readonly [number, number] | null;
}

interface Report {
  readonly unit: string;
  readonly from: string;
  readonly to: string;
  readonly tested_by: string;
  readonly tables: number;
  readonly older_left_out: boolean;
  readonly p90: Kept;
  readonly p50: Kept;
  readonly tested: readonly {
    readonly no: number;
    readonly begins: string;
    readonly power_MW_el: number;
    readonly energy_MWh_el: { readonly p90: number; readonly p50: number };
    readonly delivered_MWh_el: number;
    readonly ended_by: string;
  }[];
  readonly untested: Readonly<Record<string, number>>;
}

/** `rockhour offers --report`: what a daemon's kept offers were worth. */
export async function reportText(options: OffersOptions): Promise<string> {
  if (options.url === undefined) {
    throw new RockhourError('USAGE', '--report needs --url: kept offers are those of a daemon');
  }
  const { from, to } = options;
  const { stale: _, ...asker } = options;
  const answer = await askAhead(asker, 'offers/report', { from, to });
  const report = answer as unknown as Report;
  if (options.json) return JSON.stringify(report);
  const others = Object.entries(report.untested).filter(([, count]) => count > 0);
  const rows = report.tested.map((one) => [
    ...[one.no, one.begins, one.power_MW_el, one.energy_MWh_el.p90.toFixed(3)],
    ...[one.energy_MWh_el.p50.toFixed(3), one.delivered_MWh_el.toFixed(3), one.ended_by],
  ]);
  const header = ['no', 'begins', 'MW_el', 'MWh_el p90', 'MWh_el p50', 'MWh_el given', 'ended by'];
  return [
    `${report.unit}: offers asked from ${report.from} to ${report.to}`,
    ...(report.older_left_out
      ? [`Only the newest ${report.tables} tables: ask for less time to see older ones.`]
      : []),
    ...(rows.length === 0 ? ['No offer was put to the test.'] : [table(header, rows)]),
    line('p90', report.p90),
    line('p50', report.p50),
    ...(others.length === 0
      ? []
      : [`Not put to the test: ${others.map(([why, n]) => `${n} ${why}`).join(', ')}.`]),
    report.tested_by,
  ].join('\n');
}

function line(name: string, { kept, of, meant, share, interval }: Kept): string {
  if (share === null || interval === null) return `${name}: none to count`;
  const percent = (value: number): string => `${Math.round(value * 100)} %`;
  const within = `${percent(interval[0])} to ${percent(interval[1])}`;
  return `${name}: kept ${kept} of ${of}, ${percent(share)} (95 % interval ${within}), meant ${percent(meant)}`;
}
