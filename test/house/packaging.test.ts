import { execFileSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { Registry } from 'prom-client';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { metricsText } from '../../src/adapters/http/metrics.js';
import { ScanTimes } from '../../src/adapters/http/scanTimes.js';
import { Counters } from '../../src/daemon/counters.js';
import { EXIT_CODES } from '../../src/errors.js';
import { shippedEnvironment } from '../../tools/load/shipped.js';
import { ScriptedPlant } from '../adapters/http/scriptedPlant.js';
import { requireProgram } from '../support/requirements.js';
import { root } from './imports.js';

const read = (file: string) => readFileSync(join(root, file), 'utf8');
const analyze = requireProgram('systemdAnalyze');

/** Directives of a unit file by section, in their order. */
function sections(text: string): Record<string, [string, string][]> {
  const found: Record<string, [string, string][]> = {};
  let section = '';
  for (const line of text.split('\n')) {
    const head = /^\[(\w+)\]$/.exec(line);
    if (head) section = head[1]!;
    const directive = /^(\w+)=(.*)$/.exec(line);
    if (directive) {
      const [, name, value] = directive;
      found[section] = [...(found[section] ?? []), [name!, value!]];
    }
  }
  return found;
}

describe('the systemd unit', () => {
  const file = 'config/rockhour.service';
  const service = new Map(sections(read(file)).Service);

  it('starts, reloads and ends the daemon as the daemon wants it', () => {
    expect(service.get('ExecStart')).toMatch(/rockhour run --config \/etc\/rockhour\/plant\.yaml$/);
    expect(service.get('ExecReload')).toContain('-HUP');
    // The daemon ends within 5 s; a configuration with faults does not get better by being read again.
    expect(Number(service.get('TimeoutStopSec'))).toBeGreaterThan(5);
    expect(service.get('RestartPreventExitStatus')).toBe(String(EXIT_CODES.usage.code));
    expect(service.get('WorkingDirectory')).toBe(`/var/lib/${service.get('StateDirectory')}`);
  });

  it('sets the same for its memory as the image does', () => {
    const image = Object.fromEntries(
      [...read('Dockerfile').matchAll(/\b(MALLOC_\w+|NODE_\w+)=(\S+)/g)].map(([, k, v]) => [k, v]),
    );
    expect(Object.keys(image)).toHaveLength(5);
    expect(shippedEnvironment()).toEqual(image);
  });

  it.skipIf(!analyze)('has an exposure below 2 of 10 in the eyes of systemd itself', () => {
    const args = ['security', '--offline=true', '--no-pager', '--threshold=20', join(root, file)];
    // Ends with an error where the exposure is above the threshold.
    const told = execFileSync(analyze!, args, { encoding: 'utf8' });
    expect(told).toMatch(/Overall exposure level for rockhour\.service: [01]\.\d/);
  });
});

describe('the example rules for Prometheus', () => {
  const { groups } = parse(read('config/prometheus-rules.yaml')) as {
    groups: { rules: { alert: string; expr: string; annotations: Record<string, string> }[] }[];
  };
  const rules = groups.flatMap((group) => group.rules);

  it('use only what /metrics tells, and say what to do', async () => {
    const plant = new ScriptedPlant();
    const counts = new Counters().all();
    const scanTimes = new ScanTimes();
    scanTimes.observe('north', 0.02);
    plant.counts = {
      stores: { hot: { thermocouples: 1, used: 1, rejected: 0, left_out: 0, missing: 0 } },
      surprise: { hot: 1 },
      implausible: [],
      mode_disagrees: false,
      mode_disagreements: 0,
    };
    const service = Object.assign(plant, { counters: () => counts, scanTimes });
    const { text, contentType } = await metricsText(service, {});
    expect(contentType).toBe(new Registry().contentType);
    const told = new Set([...text.matchAll(/^([a-z_]+)[{ ]/gm)].map(([, name]) => name));
    expect(rules.length).toBeGreaterThan(8);
    for (const { alert, expr, annotations } of rules) {
      const used = [...expr.matchAll(/\b((?:rockhour|process|nodejs)_[a-z_]+)\b/g)];
      if (alert !== 'RockhourAway') expect(used.length, alert).toBeGreaterThan(0);
      for (const [, name] of used) expect(told, `${alert} uses ${name}`).toContain(name);
      expect(Object.keys(annotations).sort()).toEqual(['action', 'summary']);
    }
  });
});

describe('what rockhour is made of', () => {
  const made = JSON.parse(read('package.json')) as Record<string, Record<string, string>>;

  it('is pinned to single versions', () => {
    const all = { ...made.dependencies, ...made.devDependencies };
    const loose = Object.entries(all).filter(([, version]) => !/^\d+\.\d+\.\d+$/.test(version));
    expect(loose).toEqual([]);
  });

  it('is listed by npm run sbom: every package that is installed to run it, with its version', () => {
    const text = execFileSync('npm', ['run', '--silent', 'sbom'], { cwd: root, encoding: 'utf8' });
    const { bomFormat, components } = JSON.parse(text) as {
      bomFormat: string;
      components: { name: string; group?: string; version: string }[];
    };
    expect(bomFormat).toBe('CycloneDX');
    const listed = components.map(({ name, version }) => `${name} ${version}`).sort();
    const { packages } = JSON.parse(read('package-lock.json')) as {
      packages: Record<string, { version: string; dev?: boolean; devOptional?: boolean }>;
    };
    const run = Object.entries(packages)
      .filter(([path, { dev, devOptional }]) => path !== '' && !dev && !devOptional)
      .map(([path, { version }]) => `${path.split('node_modules/').at(-1)} ${version}`);
    expect(run.length).toBeGreaterThan(Object.keys(made.dependencies!).length);
    expect(listed).toEqual(expect.arrayContaining(run));
    const development = Object.keys(made.devDependencies!).filter(
      (name) => packages[`node_modules/${name}`]!.dev,
    );
    expect(development.length).toBeGreaterThan(5);
    expect(listed.filter((one) => development.includes(one.split(' ')[0]!))).toEqual([]);
  });
});
