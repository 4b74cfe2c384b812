import type { WatchView } from '../../core/watch/causes.js';
import type { IndicatorKind, IndicatorView } from '../../core/watch/indicator.js';
import type { WatchHistoryView } from './schema/playback.js';

type Columns = Pick<WatchHistoryView, 'times' | 'indicators'>;
type Column = Columns['indicators'][number];

const NUMBERS = ['value', 'sigma', 'healthy', 'limit', 'deadband', 'score'] as const;

/**
 * Views one after the other as a column per indicator and figure, with null where a view has not got
 * the indicator: it may have come with a later version, or with a string added since.
 */
export function watchColumns(
  views: readonly WatchView[],
  kinds: readonly IndicatorKind[] | undefined,
): Columns {
  const found = new Map<string, Column>();
  const wanted = kinds && new Set(kinds);
  views.forEach((view, row) => {
    for (const indicator of view.indicators) {
      if (wanted?.has(indicator.kind) === false) continue;
      const key = `${indicator.kind}/${indicator.subject}`;
      const column = found.get(key) ?? emptyColumn(indicator, views.length);
      found.set(key, column);
      column.unit = indicator.unit;
      for (const name of NUMBERS) column[name][row] = indicator[name];
      column.state[row] = indicator.state;
    }
  });
  return { times: views.map(({ time }) => time), indicators: [...found.values()] };
}

function emptyColumn({ kind, subject, unit }: IndicatorView, rows: number): Column {
  const empty = () => new Array<null>(rows).fill(null);
  return {
    ...{ kind, subject, unit },
    ...{ value: empty(), sigma: empty(), healthy: empty() },
    ...{ limit: empty(), deadband: empty(), score: empty(), state: empty() },
  };
}
