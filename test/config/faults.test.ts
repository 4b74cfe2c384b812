import { describe, expect, it } from 'vitest';
import { faultsAsText } from '../../src/config/faults.js';
import { parseSite } from '../../src/config/load.js';
import { CONFIG_FOLDER, exampleText, faultsOf } from './sites.js';

describe('faults of a site file', () => {
  it('are all reported at once, structural ones beside contradictions, with path, line, value and hint', () => {
    const text = exampleText('demo')
      .replace('height_m: 9.2', 'hieght_m: 9.2')
      .replace('void_fraction: 0.40', 'void_fraction: forty')
      .replace('solid: granite', 'solid: granit')
      .replace('power_min_MW_el: 0.4', 'power_min_MW_el: 4')
      .replace('8.77]', '9.77]');
    const { faults } = parseSite(text, CONFIG_FOLDER, {});
    const lineOf = (part: string) => text.split('\n').findIndex((l) => l.includes(part)) + 1;
    const brief = faults!.map(({ path, line, found, hint }) => ({ path, line, found, hint }));
    expect(brief).toContainEqual({
      path: 'units[0].stores[0].bed.hieght_m',
      line: lineOf('hieght_m'),
      found: 'a key that is not known here',
      hint: 'did you mean height_m?',
    });
    expect(brief).toContainEqual({
      path: 'units[0].stores[0].bed.void_fraction',
      line: lineOf('forty'),
      found: 'the text "forty"',
      hint: null,
    });
    expect(brief).toContainEqual({
      path: 'units[0].stores[0].bed.solid',
      line: lineOf('solid: granit'),
      found: 'the text "granit"',
      hint: 'did you mean granite?',
    });
    expect(brief).toContainEqual({
      path: 'units[0].limits.discharge.power_min_MW_el',
      line: lineOf('power_min_MW_el: 4'),
      found: '4',
      hint: null,
    });
    // The misspelt height is read as the height, so the thermocouple at 9.77 m is seen outside.
    expect(brief.filter((f) => f.path.endsWith('positions_m[13]')).map((f) => f.found)).toEqual([
      '9.77',
      '9.77',
      '9.77',
    ]);
    expect(brief).toHaveLength(7);
    const lines = faults!.map((f) => f.line!);
    expect(lines).toEqual([...lines].sort((a, b) => a - b));
  });

  it('say what was expected in words with the unit and an example', () => {
    const [fault] = faultsOf('demo', (d) => {
      d.units[0].stores[0].bed.particle_diameter_mm = '20 mm';
    });
    expect(fault).toEqual({
      path: 'units[0].stores[0].bed.particle_diameter_mm',
      line: expect.any(Number),
      found: 'the text "20 mm"',
      expected: 'a number from 0.1 up to 500 [mm], such as 20',
      hint: 'the unit is part of the key: write the bare number',
    });
  });

  it.each([
    ['"20"', 'write the number without quotation marks'],
    ['"20,5"', 'decimals are written with a point'],
  ])('explain why %s is no number', (value, hint) => {
    const text = exampleText('demo').replace(
      'particle_diameter_mm: 20',
      `particle_diameter_mm: ${value}`,
    );
    expect(parseSite(text, CONFIG_FOLDER, {}).faults?.map((f) => f.hint)).toEqual([hint]);
  });

  it.each([
    [
      'a value out of physical range',
      (b: Record<string, unknown>) => (b.void_fraction = 1.4),
      'void_fraction',
    ],
    ['a negative length', (b: Record<string, unknown>) => (b.height_m = -1), 'height_m'],
    ['not a number', (b: Record<string, unknown>) => (b.diameter_m = Number.NaN), 'diameter_m'],
    [
      'infinity',
      (b: Record<string, unknown>) => (b.diameter_m = Number.POSITIVE_INFINITY),
      'diameter_m',
    ],
    ['an empty value', (b: Record<string, unknown>) => (b.diameter_m = null), 'diameter_m'],
    ['a missing value', (b: Record<string, unknown>) => delete b.diameter_m, 'diameter_m'],
  ])('name %s', (_, change, key) => {
    const faults = faultsOf('demo', (d) => change(d.units[0].stores[1].bed));
    expect(faults.map((f) => f.path)).toEqual([`units[0].stores[1].bed.${key}`]);
  });

  it('name temperatures below absolute zero', () => {
    const faults = faultsOf('demo', (d) => {
      d.units[0].stores[1].reference_cold_degC = -300;
    });
    expect(faults.map((f) => [f.path, f.found])).toEqual([
      ['units[0].stores[1].reference_cold_degC', '-300'],
    ]);
  });

  it('list the words of a choice and the near one', () => {
    const [fault] = faultsOf('demo', (d) => {
      d.units[0].machine.kind = 'gas-cycle';
    });
    expect(fault).toMatchObject({
      path: 'units[0].machine.kind',
      found: 'the text "gas-cycle"',
      expected: 'one of gas_cycle, efficiency_table',
      hint: 'did you mean gas_cycle?',
    });
  });

  it('do not follow from what was only made up to go on checking', () => {
    // Without a height nothing can be said of positions; the example height of 8 m must not speak.
    const faults = faultsOf('demo', (d) => {
      d.units[0].stores[0].bed.height_m = 'high';
    });
    expect(faults.map((f) => f.path)).toEqual(['units[0].stores[0].bed.height_m']);
  });

  it('tell where contradictions could not be looked for', () => {
    const text = exampleText('demo').replace(/limits:\n(?: {6,}.*\n)+/, 'limits: none\n');
    const parsed = parseSite(text, CONFIG_FOLDER, {});
    expect(parsed.faults?.map((f) => f.path)).toEqual(['units[0].limits']);
    expect(parsed).toMatchObject({ more_may_follow: true });
    expect(faultsAsText('x', parsed.faults!, true)).toMatch(/more may follow\.$/);
    expect(parseSite('name: 3', CONFIG_FOLDER, {})).toMatchObject({ more_may_follow: true });
  });

  it('read as sentences with one block per fault', () => {
    const faults = faultsOf('demo', (d) => {
      d.units[0].scan_period_s = 0;
    });
    expect(faultsAsText('plant.yaml', faults)).toMatch(
      /^plant\.yaml: 1 fault\n\n {2}line \d+: units\[0\]\.scan_period_s\n {4}found {5}0\n {4}expected {2}a number from 1 up to 3600 \[s\], such as 30$/,
    );
  });

  it('never carry control characters of the file to the terminal', () => {
    const faults = faultsOf('demo', (d) => {
      d.units[0].machine.gas = '\u001b[2Jargon';
    });
    expect(faultsAsText('x', faults)).not.toContain('\u001b');
  });
});

describe('a file that is no YAML or no site', () => {
  it.each([
    ['an empty file', ''],
    ['a comment', '# nothing'],
    ['a list', '- a\n- b'],
    ['a word', 'hello'],
    ['a tab', 'name:\n\tfoo: 1'],
    ['an open bracket', 'name: [1, 2'],
    ['a key twice', 'name: a\nname: b'],
    ['two documents', 'name: a\n---\nname: b'],
    ['an alias without anchor', 'name: *nowhere'],
    ['an alias of itself', 'name: &a [*a]'],
    [
      'an alias bomb',
      'a: &a [x,x,x,x,x,x,x,x,x]\nb: &b [*a,*a,*a,*a,*a,*a,*a,*a,*a]\nc: &c [*b,*b,*b,*b,*b,*b,*b,*b,*b]\nd: [*c,*c,*c,*c,*c,*c,*c,*c,*c]',
    ],
    ['a forbidden key', '__proto__: {a: 1}\nconstructor: 1'],
    ['binary rubbish', '\u0000\u0001\ufffd'],
  ])('is answered by faults: %s', (_, text) => {
    const { faults } = parseSite(text, CONFIG_FOLDER, {});
    expect(faults!.length).toBeGreaterThan(0);
    for (const fault of faults!) {
      expect(fault.path).not.toBe('');
      expect(fault.expected).not.toBe('');
    }
  });

  it('tells the line of a fault of YAML', () => {
    const { faults } = parseSite('name: a\nunits: []\nname: b\n', CONFIG_FOLDER, {});
    expect(faults).toEqual([
      {
        path: '(whole file)',
        line: 3,
        found: 'a key that stands here twice',
        expected: 'YAML that can be read',
        hint: 'keep one of the two',
      },
    ]);
  });
});
