import { loadSite } from '../config/load.js';
import type { SiteConfig } from '../config/site.js';
import type { UnitDefinition } from '../core/definitions.js';
import { RockhourError } from '../errors.js';

/** The unit that `--unit` names, or the only one of the site. */
export function chooseUnit(site: SiteConfig, id: string | undefined): UnitDefinition {
  const ids = site.units.map((unit) => unit.id);
  const chosen =
    id === undefined && site.units.length === 1
      ? site.units[0]
      : site.units.find((unit) => unit.id === id);
  if (chosen !== undefined) return chosen;
  throw new RockhourError(
    'UNIT_UNKNOWN',
    id === undefined
      ? `the configuration has several units and none was named: ${ids.join(', ')}`
      : `there is no unit ${JSON.stringify(id)} in the configuration, which has ${ids.join(', ')}`,
  );
}

/** A unit of a configuration file, and the channels of the other units there. */
export function loadUnit(
  path: string,
  id: string | undefined,
): { unit: UnitDefinition; otherChannels: ReadonlySet<string> } {
  const site = loadSite(path);
  const unit = chooseUnit(site, id);
  const others = site.units.filter((other) => other !== unit);
  return {
    unit,
    otherChannels: new Set(others.flatMap((other) => other.channels.map((channel) => channel.id))),
  };
}
