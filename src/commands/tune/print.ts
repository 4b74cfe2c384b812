import type { TuneResult, TuneRow } from '../../core/tune/result.js';
import { table } from '../table.js';
import { labelOf, NAMES, percent, reasonOf } from './words.js';

/** A correlation below this is not worth a word. */
const WORTH_TELLING = 0.5;

/** The answer as text. */
export function tuneText(result: TuneResult): string {
  const { hours } = result;
  const h = (value: number) => `${value.toFixed(1)} h`;
  const groups = [
    null,
    ...new Set(result.rows.map((row) => row.store).filter((id) => id !== null)),
  ];
  const lines = [
    `${result.unit}: ${result.from} to ${result.to}: ${h(hours.charge)} charging, ${h(hours.discharge)} discharging, ${h(hours.stand)} standing`,
  ];
  if (result.other_stretches > 0) {
    lines.push(
      `gaps in time or flow part off ${result.other_stretches} other stretches of ${h(result.other_hours)} in all, not used`,
    );
  }
  for (const group of groups) {
    const rows = result.rows.filter((row) => row.store === group);
    lines.push('', group === null ? 'unit' : `store ${group}${fitWords(result, group)}`);
    lines.push(
      table(
        ['', 'value', '1 sigma', 'known before', ''],
        rows.map((row) => [
          NAMES[row.name],
          ...figures(row),
          row.determined ? '' : 'not determined',
        ]),
      ),
    );
  }
  const open = result.rows.filter((row) => !row.determined);
  if (open.length > 0) {
    lines.push('', 'What this recording does not determine:');
    for (const row of open) lines.push(`  ${labelOf(row)}: ${reasonOf(row, result.rows)}`);
  }
  const pairs = strongPairs(result);
  if (pairs.length > 0) lines.push('', 'Values that move together (correlation):', ...pairs);
  for (const fit of result.fits) {
    if (!fit.converged) {
      lines.push('', `store ${fit.store}: the search has not settled; its values are rough`);
    }
    for (const { id, residual_K } of fit.left_out) {
      lines.push(
        '',
        `left out: ${id}, which the model misses by ${residual_K.toFixed(1)} K; see what is wrong with it`,
      );
    }
  }
  lines.push(
    '',
    'Factors are on the published correlation or the configured value. Hours need the',
  );
  lines.push('front travel and the work per metered kg; where the meter and the heat capacity are');
  lines.push('not told apart, their errors cancel there.');
  return lines.join('\n');
}

function fitWords(result: TuneResult, store: string): string {
  const fit = result.fits.find((one) => one.store === store);
  return fit === undefined || !Number.isFinite(fit.residual_K)
    ? ''
    : `, followed to ${fit.residual_K.toFixed(2)} K rms`;
}

function figures(row: TuneRow): [string, string, string] {
  const share = row.name === 'gas_share';
  const text = (sigma: number | null) =>
    sigma === null ? '-' : share ? sigma.toFixed(2) : `${percent(sigma)} %`;
  if (row.reason === 'no_power_that_way') return ['-', '-', text(row.prior_sigma)];
  return [row.value.toFixed(share ? 2 : 3), text(row.sigma), text(row.prior_sigma)];
}

function strongPairs(result: TuneResult): string[] {
  const { rows, correlations } = result;
  return rows.flatMap((a, i) =>
    rows.slice(i + 1).flatMap((b, k) => {
      const r = correlations[i]?.[i + 1 + k] as number;
      if (!(Math.abs(r) >= WORTH_TELLING)) return [];
      return [`  ${r >= 0 ? ' ' : ''}${r.toFixed(2)}  ${labelOf(a)} | ${labelOf(b)}`];
    }),
  );
}
