import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Command } from 'commander';
import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { register } from '../../src/commands/check.js';
import { siteJsonSchema } from '../../src/config/jsonSchema.js';
import { referenceText } from '../../src/config/reference.js';
import { exitCodeOf, explain } from '../../src/errors.js';
import { CONFIG_FOLDER, EXAMPLES, exampleText } from '../config/sites.js';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rockhour-check-'));
});
afterEach(() => rmSync(folder, { recursive: true }));

/** Runs the command in this process: what it wrote, and what it threw. */
async function check(...args: string[]): Promise<{ out: string; thrown: unknown }> {
  let out = '';
  const write = vi.spyOn(process.stdout, 'write').mockImplementation((chunk) => {
    out += String(chunk);
    return true;
  });
  const program = new Command();
  register(program);
  try {
    await program.parseAsync(['node', 'rockhour', 'check', ...args]);
    return { out, thrown: null };
  } catch (thrown) {
    return { out, thrown };
  } finally {
    write.mockRestore();
  }
}

describe('rockhour check', () => {
  it.each(EXAMPLES)('prints the facts of %s as aligned lines', async (name) => {
    const { out, thrown } = await check('--config', `${CONFIG_FOLDER}${name}.yaml`);
    expect(thrown).toBeNull();
    expect(out).toMatch(/is sound\.\n/);
    for (const row of [
      /^Capacity between the references +[\d.]+.* {2}MWh_th$/m,
      /^NTU +[\d. ]+ {2}-$/m,
      /^Front width \(sigma\) by then +[\d. ]+ {2}m$/m,
      /^Thermocouples per front +/m,
      /^Discharge: .* the rated [\d.]+ h\./m,
      /^Command to power, warm +[\d.]+ +[\d.]+ {2}min$/m,
      /^Connected for that power +[\d.-]+ +[\d.-]+ {2}h\/d$/m,
      /^Limits that are not there\n(?: {2}\S.*\n {4}instead: .*\n(?: {4,}.*\n)*)+/m,
    ]) {
      expect(out).toMatch(row);
    }
    // Units of one table begin in one column.
    const table = out
      .split('\n')
      .filter((line) => /^(Volume|Re|NTU|Front speed|Coldest fluid) /.test(line));
    expect(new Set(table.map((line) => line.lastIndexOf('  '))).size).toBe(1);
    expect(table).toHaveLength(5);
    expect(out).not.toMatch(/NaN|undefined|Infinity/);
  });

  it('gives the same facts as JSON', async () => {
    const { out } = await check('--config', `${CONFIG_FOLDER}demo.yaml`, '--json');
    const answer = JSON.parse(out);
    expect(answer).toMatchObject({ sound: true, units: [{ id: 'vellmoor', rated_hours_h: 6 }] });
    expect(answer.units[0].limits.discharge).toMatchObject({
      from_warm_min: 12,
      connected_h_d: 24,
    });
    expect(answer.units[0].missing_limits.map((m: { limit: string }) => m.limit)).toEqual([
      'outages',
    ]);
    expect(answer.units[0].stores.map((s: { id: string }) => s.id)).toEqual(['hot', 'cold']);
  });

  it('lists every fault at once and ends with exit code 2', async () => {
    const path = join(folder, 'bad.yaml');
    writeFileSync(
      path,
      exampleText('demo')
        .replaceAll('diameter_m:', 'diametre_m:')
        .replace('_degC: 460', '_degC: hot'),
    );
    const { out, thrown } = await check('--config', path);
    expect(out).toBe('');
    expect(exitCodeOf(thrown)).toBe(2);
    const said = explain(thrown);
    expect(said).toContain(`${path}: 3 faults`);
    expect(said.match(/did you mean diameter_m\?/g)).toHaveLength(2);
    expect(said).toContain('units[0].stores[0].reference_hot_degC');
  });

  it('lists faults as JSON on request, with the same exit code', async () => {
    const path = join(folder, 'bad.yaml');
    writeFileSync(path, 'name: x\nunits: []\n');
    const { out, thrown } = await check('--config', path, '--json');
    expect(exitCodeOf(thrown)).toBe(2);
    expect(JSON.parse(out)).toMatchObject({
      file: path,
      sound: false,
      faults: [{ path: 'units', line: 2, found: 'a list of 0' }],
    });
  });

  it('prints the JSON Schema and the reference', async () => {
    expect(JSON.parse((await check('--schema')).out)).toEqual(
      JSON.parse(JSON.stringify(siteJsonSchema())),
    );
    expect((await check('--explain')).out).toBe(referenceText());
  });

  it('asks for a file where none is named', async () => {
    const { thrown } = await check();
    expect(exitCodeOf(thrown)).toBe(2);
    expect(explain(thrown)).toMatch(/check needs --config/);
  });
});
