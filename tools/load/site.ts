import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parse, stringify } from 'yaml';
import { loadSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';

const DEMO = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));

export interface LoadSite {
  readonly path: string;
  readonly site: SiteConfig;
}

export interface LoadSiteOptions {
  readonly folder: string;
  readonly broker: string;
  readonly units: number;
  readonly scan_period_s: number;
  readonly payload: 'value' | 'array';
  readonly protocol?: 4 | 5;
}

interface Block {
  readonly [key: string]: unknown;
}

/** Units like that of config/demo.yaml, all of it as it stands there but for period and payload. */
export function writeLoadSite(options: LoadSiteOptions): LoadSite {
  const { folder, broker, units: count, scan_period_s, payload, protocol = 5 } = options;
  mkdirSync(folder, { recursive: true });
  const path = join(folder, 'site.yaml');
  const demo = parse(readFileSync(DEMO, 'utf8')) as Block & {
    units: (Block & { stores: Block[] })[];
  };
  const unit = demo.units[0]!;
  const stores = unit.stores.map((store) => ({
    ...store,
    strings: (store.strings as Block[]).map((string) => ({ ...string, payload })),
  }));
  const units = Array.from({ length: count }, (_, i) => {
    const no = String(i + 1).padStart(3, '0');
    return { ...unit, id: `u${no}`, name: `Unit ${no}`, scan_period_s, stores };
  });
  const own = {
    units,
    mqtt: { url: broker, protocol, client_id: 'load', in_prefix: 'plant', out_prefix: 'rockhour' },
    store: { folder: './data' },
    http: { port: 0 },
  };
  writeFileSync(path, stringify({ ...demo, ...own }, { aliasDuplicateObjects: false }));
  return { path, site: loadSite(path) };
}
