import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../src/config/load.js';
import { DEMO_GEOMETRY } from './plant/demoGeometry.js';
import { geometryOf } from './plantGeometryOf.js';

describe('the finer plant', () => {
  it('imports nothing from src and nothing but its own files', () => {
    const folder = new URL('./plant/', import.meta.url);
    const files = readdirSync(folder).filter((name) => name.endsWith('.ts'));
    expect(files.length).toBeGreaterThan(10);
    for (const name of files) {
      const text = readFileSync(new URL(name, folder), 'utf8');
      const targets = [...text.matchAll(/(?:from|import)\s*\(?\s*['"]([^'"]+)['"]/g)].map(
        (m) => m[1]!,
      );
      for (const target of targets) expect(`${name}: ${target}`).toMatch(/: \.\/[A-Za-z]+\.js$/);
    }
  });

  it('has the geometry, machine, limits and channels of config/demo.yaml', () => {
    const unit = loadSite(new URL('../config/demo.yaml', import.meta.url).pathname).units[0]!;
    const configured = geometryOf(unit, DEMO_GEOMETRY.rated_flow_kg_s);
    // One float spacing of room: the two convert degrees and shares in different order.
    const rounded = (value: unknown) =>
      JSON.parse(
        JSON.stringify(value, (_, v: unknown) =>
          typeof v === 'number' ? Number(v.toPrecision(12)) : v,
        ),
      );
    expect(rounded(DEMO_GEOMETRY)).toEqual(rounded(configured));
  });
});
