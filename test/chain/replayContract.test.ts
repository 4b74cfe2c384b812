import { execFile } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { beforeAll, describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { ADDITIONAL, type ContractLine, contractLine } from './replayContract.js';

/**
 * The real output of `rockhour replay` on half a day of the finer simulated plant, made harder (no
 * readings at first, a gap, dead and burst thermocouples, text), against the contract.
 */
const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('contract');
const unit: UnitDefinition = loadSite(CONFIG).units[0]!;
const PERIOD_S = 30;

type Rows = string[][];

async function simulated(hours: number): Promise<Rows> {
  const out = join(folder, 'plain.csv');
  const args = ['--import', 'tsx', 'tools/simulate.ts', '--hours', String(hours), '--seed', '3'];
  await promisify(execFile)(process.execPath, [...args, '--out', out]);
  return readFileSync(out, 'utf8')
    .trimEnd()
    .split('\n')
    .map((line) => line.trimEnd().split(','));
}

function write(name: string, rows: Rows): string {
  const path = join(folder, name);
  writeFileSync(path, `${rows.map((row) => row.join(',')).join('\r\n')}\r\n`);
  return path;
}

async function replay(recording: string, ...more: string[]) {
  const out = `${recording}.${more.join('')}.jsonl`;
  const args = ['--config', CONFIG, '--recording', recording, '--out', out];
  const { code, stderr } = await rockhour(['replay', ...args, ...more]);
  expect(code, stderr).toBe(0);
  const text = readFileSync(out, 'utf8');
  expect(text.endsWith('\n')).toBe(true);
  return { text, lines: text.trimEnd().split('\n'), stderr };
}

const parsed = (lines: readonly string[]) =>
  lines.map((line) => contractLine.parse(JSON.parse(line)));

const EMPTY = [
  [0, 4],
  [700, 760],
] as const;

function harder(rows: Rows): Rows {
  const [header, ...body] = rows;
  const column = (id: string) => header!.indexOf(id);
  const set = (id: string, from: number, to: number, value: string) => {
    for (const row of body.slice(from, to)) row[column(id)] = value;
  };
  set('hot_rim_05', 200, 400, '');
  set('cold_axis_05', 300, 500, '9999');
  set('hot_axis_03', 600, 601, 'Bad Input');
  set('flow', 610, 620, 'NaN');
  for (const [from, to] of EMPTY) {
    for (const row of body.slice(from, to)) row.fill('', 1);
  }
  return [header!, ...body];
}

describe('the output of rockhour replay on the finer plant, against its contract', () => {
  let rows: Rows;
  let text: string;
  let lines: ContractLine[];
  beforeAll(async () => {
    rows = harder(await simulated(9.5));
    const path = write('hard.csv', rows);
    const asked = ['--hours-at', '2,1.2', '--hours-every', '30min'];
    const found = await replay(path, ...asked);
    text = found.text;
    lines = parsed(found.lines);
  }, 120_000);

  it('has one line per row, at its time, all-empty rows included, each with every key of the contract', () => {
    expect(lines.map(({ time }) => time)).toEqual(rows.slice(1).map(([time]) => time));
    for (const [from, to] of EMPTY) {
      for (const line of lines.slice(from, to)) {
        for (const store of Object.values(line.stores)) expect(store.sensors.used).toBe(0);
      }
    }
    expect(text).not.toMatch(/NaN|Infinity|undefined/);
  });

  it('has the additional keys that are listed, and none that is listed without need', () => {
    for (const line of text.trimEnd().split('\n')) {
      for (const store of Object.values((JSON.parse(line) as ContractLine).stores)) {
        for (const key of ADDITIONAL.store) expect(store).toHaveProperty(key);
      }
    }
    const rejected = lines.flatMap((line) =>
      Object.values(line.stores).flatMap((store) => store.sensors.rejected),
    );
    for (const one of rejected)
      for (const key of ADDITIONAL.rejected) expect(one).toHaveProperty(key);
  });

  it('shows all three modes, good estimates and honest ones, and more than one verdict', () => {
    const seen = (pick: (line: ContractLine) => string[]) => new Set(lines.flatMap(pick));
    expect([...seen((line) => [line.mode])].sort()).toEqual(['charge', 'discharge', 'stand']);
    const qualities = seen((line) => [line.quality]);
    for (const quality of ['good', 'blind', 'stale']) expect(qualities).toContain(quality);
    const verdicts = seen((line) =>
      Object.values(line.stores).flatMap(({ sensors }) => sensors.rejected.map((r) => r.verdict)),
    );
    expect(verdicts).toContain('open');
    expect(verdicts).toContain('burst');
  });

  it('names the stores and strings of the configuration, and counts each thermocouple once at most', () => {
    for (const line of lines) {
      expect(line.unit).toBe(unit.id);
      expect(Object.keys(line.stores)).toEqual(unit.stores.map(({ id }) => id));
      for (const store of unit.stores) {
        const { strings, sensors } = line.stores[store.id]!;
        expect(strings.map(({ id }) => id)).toEqual(store.strings.map(({ id }) => id));
        const ids = store.strings.flatMap((one) => one.thermocouples.map(({ id }) => id));
        const rejected = sensors.rejected.map(({ id }) => id);
        expect(new Set(rejected).size).toBe(rejected.length);
        expect(ids).toEqual(expect.arrayContaining(rejected));
        expect(sensors.used + rejected.length).toBeLessThanOrEqual(ids.length);
        for (const { since } of sensors.rejected) {
          expect(Date.parse(since)).toBeLessThanOrEqual(Date.parse(line.time));
        }
      }
    }
  });

  it('orders fronts by x, inside the bed, and gives a reason where there is none', () => {
    for (const line of lines) {
      for (const { id, bed } of unit.stores) {
        const { fronts, fronts_reason, energy_position_m } = line.stores[id]!;
        expect(fronts_reason === null).toBe(fronts.length > 0);
        const positions = fronts.map(({ position_m }) => position_m).filter((x) => x !== null);
        expect(positions).toEqual([...positions].sort((a, b) => a - b));
        for (const x of positions) {
          expect(x).toBeGreaterThanOrEqual(0);
          expect(x).toBeLessThanOrEqual(bed.length_m);
        }
        for (const front of fronts) {
          // A value and its sigma are there together or not at all.
          expect(front.position_m === null).toBe(front.position_sigma_m === null);
          expect(front.width_m === null).toBe(front.width_sigma_m === null);
        }
        if (energy_position_m !== null)
          expect(Math.abs(energy_position_m)).toBeLessThan(2 * bed.length_m);
      }
    }
    // Before the first reading there is nothing to see.
    for (const store of Object.values(lines[0]!.stores)) {
      expect(store.fronts_reason).toBe('not_started');
    }
  });

  it('has hours at the first row and then once per half hour, for the powers asked, and else no such key', () => {
    const half = 1800 / PERIOD_S;
    lines.forEach((line, i) => {
      // The recording begins one period after a full hour.
      const isDue = i === 0 || (i + 1) % half === 0;
      expect('dispatch' in line, `row ${i + 2}`).toBe(isDue);
      if (!line.dispatch) return;
      expect(line.dispatch.map(({ power_MW }) => power_MW)).toEqual([2, 1.2]);
      for (const { hours, energy_MWh_el, power_MW } of line.dispatch) {
        expect(hours.p90).toBeLessThanOrEqual(hours.p50);
        expect(hours.p50).toBeLessThanOrEqual(hours.p10);
        for (const p of ['p90', 'p50', 'p10'] as const) {
          // Constant net power: two roundings of a product.
          expect(Math.abs(energy_MWh_el[p] - power_MW * hours[p])).toBeLessThan(
            4 * Number.EPSILON * Math.max(1, energy_MWh_el[p]),
          );
        }
      }
    });
  });

  it('tells each event in the line of its time, returned only what was raised', () => {
    const standing = new Set<string>();
    const kinds = new Set<string>();
    for (const line of lines) {
      for (const { id, unit: owner, kind, subject, transition, time } of line.events) {
        expect(time).toBe(line.time);
        expect(owner).toBe(unit.id);
        expect(id).toBe(`${owner}/${kind}/${subject}`);
        expect(standing.has(id)).toBe(transition === 'returned');
        if (transition === 'raised') standing.add(id);
        else standing.delete(id);
        kinds.add(kind);
      }
    }
    for (const kind of ['sensor_rejected', 'data_stale']) expect(kinds).toContain(kind);
  });

  it('says the same without being asked for hours, but has no dispatch and no other difference', async () => {
    // 100 rows suffice, and a part of the rows gives a part of the lines.
    const path = write('part.csv', rows.slice(0, 101));
    const plain = parsed((await replay(path)).lines);
    expect(plain.some((line) => 'dispatch' in line)).toBe(false);
    const asked = lines.slice(0, 100).map(({ dispatch: _, ...line }) => line);
    // The state of charge is computed with the hours and carried along between.
    const without = (line: object) => ({ ...line, state_of_charge: 0 });
    expect(plain.map(without)).toEqual(asked.map(without));
  }, 60_000);
});

describe('profiles that have no front, or two', () => {
  /** Rows of a standing unit whose thermocouples read a profile over the share of the height. */
  function standing(profile: (share: number, kind: string) => number): Rows {
    const ids = unit.channels.map(({ id }) => id);
    const read = ids.map((id) => {
      for (const store of unit.stores) {
        for (const string of store.strings) {
          const found = string.thermocouples.find((one) => one.id === id);
          if (!found) continue;
          const theta = profile(found.position_m / store.bed.length_m, store.kind);
          const { reference_hot_K: hot, reference_cold_K: cold } = store;
          return (cold + theta * (hot - cold) - 273.15).toFixed(2);
        }
      }
      return unit.channels.find((one) => one.id === id)!.role.kind === 'flow' ? '0' : '';
    });
    return [['time', ...ids], ...[0, 30, 60].map((t) => [String(t), ...read])];
  }

  it.each([
    ['uniform', (): number => 0.03],
    ['no_half_crossing', (share: number): number => 0.05 + 0.3 * share],
  ])('%s', async (reason, profile) => {
    const { lines } = await replay(write(`${reason}.csv`, standing(profile)));
    for (const line of parsed(lines)) {
      for (const store of Object.values(line.stores)) {
        expect(store).toMatchObject({ fronts: [], fronts_reason: reason });
      }
    }
  });

  it('both fronts of a bed that is charged at both ends, in their order', async () => {
    const smooth = (x: number) => 0.5 * (1 - Math.tanh(x / 0.08));
    const two = (share: number) => smooth(share - 0.3) + 1 - smooth(share - 0.75);
    const { lines } = await replay(write('two.csv', standing(two)));
    for (const line of parsed(lines)) {
      for (const { id, bed } of unit.stores) {
        const places = line.stores[id]!.fronts.map(({ position_m }) => position_m! / bed.length_m);
        expect(places).toHaveLength(2);
        // Straight lines between thermocouples a fourteenth of the height apart.
        expect(Math.abs(places[0]! - 0.3)).toBeLessThan(1 / 28);
        expect(Math.abs(places[1]! - 0.75)).toBeLessThan(1 / 28);
      }
    }
  });
});
