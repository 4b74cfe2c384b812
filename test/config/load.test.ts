import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { ConfigFault, loadSite } from '../../src/config/load.js';
import { exitCodeOf } from '../../src/errors.js';
import { CONFIG_FOLDER, EXAMPLES, exampleText } from './sites.js';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rockhour-load-'));
});
afterEach(() => rmSync(folder, { recursive: true }));

function thrownBy(path: string): ConfigFault {
  try {
    loadSite(path);
  } catch (error) {
    if (error instanceof ConfigFault) return error;
    throw error;
  }
  throw new Error('nothing was thrown');
}

describe('loading a site', () => {
  it.each(EXAMPLES)('reads the example %s', (name) => {
    expect(loadSite(`${CONFIG_FOLDER}${name}.yaml`).units).toHaveLength(1);
  });

  it('takes relative paths from the folder of the file', () => {
    writeFileSync(join(folder, 'site.yaml'), exampleText('demo'));
    expect(loadSite(join(folder, 'site.yaml')).store.folder).toBe(
      join(folder, '..', 'var', 'demo'),
    );
  });

  it.each([
    ['that is not there', () => {}, 'no such file'],
    ['that is a folder', (path: string) => mkdirSync(path), 'a folder'],
    [
      'that is no text',
      (path: string) => writeFileSync(path, Buffer.from([0xff, 0xfe, 0x00, 0x80])),
      'bytes that are not UTF-8 text',
    ],
    [
      'that is far too large',
      (path: string) => writeFileSync(path, Buffer.alloc(4 * 1024 * 1024 + 1)),
      'a file of 4194305 bytes',
    ],
  ])('answers a path %s by one fault', (_, prepare, found) => {
    const path = join(folder, 'site.yaml');
    prepare(path);
    const error = thrownBy(path);
    expect(error.code).toBe('CONFIG_UNREADABLE');
    expect(error.faults.map((f) => f.found)).toEqual([found]);
    expect(exitCodeOf(error)).toBe(2);
  });

  it('throws all faults of the file as one error of the catalogue', () => {
    const path = join(folder, 'site.yaml');
    writeFileSync(
      path,
      exampleText('demo')
        .replace('scan_period_s: 30', 'scan_period_s: 0')
        .replace('argon\n', 'argonn\n'),
    );
    const error = thrownBy(path);
    expect(error.code).toBe('CONFIG_INVALID');
    expect(error.faults.map((f) => f.path)).toEqual([
      'units[0].scan_period_s',
      'units[0].machine.gas',
    ]);
    expect(error.message).toContain(`${path}: 2 faults`);
    expect(exitCodeOf(error)).toBe(2);
  });
});
