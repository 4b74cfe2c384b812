import { parseSite } from '../../src/config/load.js';
import type { Estimate, ProfileView } from '../../src/core/estimate.js';
import { advance, startUnit } from '../../src/core/unit.js';

/** One row of a measured run: values by channel id, temperatures in degC, flow in kg/s. */
export interface MeasuredRow {
  readonly time_s: number;
  readonly values: Readonly<Record<string, number>>;
}

export interface MeasuredStep {
  readonly time_s: number;
  readonly estimate: Estimate;
  readonly profile: ProfileView;
}

/** Runs rows through the unit's pipeline, without files between. */
export function runMeasured(site: string, rows: readonly MeasuredRow[]): MeasuredStep[] {
  const parsed = parseSite(site, '.');
  if (!('site' in parsed)) throw new Error(JSON.stringify(parsed.faults));
  const unit = parsed.site.units[0];
  if (unit === undefined) throw new Error('the site has no unit');
  const state = startUnit(unit);
  return rows.map(({ time_s, values }) => {
    const si = Float64Array.from(unit.channels, (channel) => {
      const value = values[channel.id];
      if (value === undefined) return Number.NaN;
      return channel.role.kind === 'flow' ? value : value + 273.15;
    });
    const scan = { time_ms: time_s * 1000, values: si, held: new Uint8Array(si.length) };
    const step = advance(unit, state, scan, { hours_at_W: [], profile: true });
    if (step.profile === null) throw new Error('no profile although asked for');
    return { time_s, estimate: step.estimate, profile: step.profile };
  });
}
