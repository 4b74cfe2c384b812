import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { fragmentText } from '../../../src/commands/tune/words.js';
import { fragmentFaults } from '../../../src/config/fragment.js';
import { configureOf } from '../../../src/core/tune/configure.js';
import type { TuneFitQuality, TuneResult, TuneRow } from '../../../src/core/tune/result.js';
import { demoUnit } from '../../support/truthRun.js';
import { tuneRows } from '../../support/tuneRows.js';

const unit = demoUnit();

function fragmentOf(cold: Partial<TuneFitQuality>, rows: TuneRow[] = tuneRows(unit)): string {
  const plain = { residual_K: 1, converged: true, left_out: [] };
  const fits = [
    { store: 'hot', ...plain },
    { store: 'cold', ...plain, ...cold },
  ];
  const result: TuneResult = {
    unit: unit.id,
    from: '2025-01-01T00:00:00.000Z',
    to: '2025-01-02T00:00:00.000Z',
    hours: { charge: 8, discharge: 6, stand: 10 },
    other_stretches: 0,
    other_hours: 0,
    rows,
    correlations: rows.map((_, i) => rows.map((_, j) => (i === j ? 1 : 0))),
    fits,
    configure: configureOf(
      unit,
      rows,
      fits.map((fit) => fit.converged),
    ),
  };
  return fragmentText(result, 'run.csv');
}

describe('the fragment of a site file', () => {
  it('holds no factor of a store whose search has not settled, and says so', () => {
    const fragment = fragmentOf({ converged: false });
    const [hot, cold] = parse(fragment).units[0].stores;
    expect(hot.factors.heat_transfer).toBe(1.2);
    expect(cold).toEqual({ id: 'cold' });
    expect(parse(fragment).units[0].machine).toBeUndefined();
    expect(fragment).toContain('# no factors: the search has not settled');
    expect(fragment).toContain(
      '# work_factor_charge: left out: the search has not settled for cold',
    );
    expect(fragmentFaults('config/demo.yaml', fragment)).toEqual([]);
  });

  it('names the thermocouples that a store was fitted without', () => {
    const left_out = [{ id: 'cold_rim_03', residual_K: 21.34 }];
    const fragment = fragmentOf({ left_out });
    expect(fragment).toContain('# fitted without cold_rim_03, which the model misses by 21.3 K');
    expect(parse(fragment).units[0].stores[1].factors.heat_transfer).toBe(1.2);
  });

  it('says which way is missing where the work factors are left out for it', () => {
    const rows = tuneRows(unit).map(
      (row): TuneRow =>
        row.store === 'hot' && row.name === 'front_travel'
          ? { ...row, determined: false, reason: 'front_too_still' }
          : row,
    );
    expect(fragmentOf({}, rows)).toContain(
      '# work_factor_discharge: left out: not determined is hot: front travel per metered kg',
    );
  });
});
