import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { beforeAll, describe, expect, it } from 'vitest';
import { buildPage } from './browser.js';

describe('the built page', () => {
  let html: string;
  let assets: { name: string; content: Buffer }[];

  beforeAll(async () => {
    const folder = await buildPage();
    html = readFileSync(join(folder, 'index.html'), 'utf8');
    const path = join(folder, 'assets');
    assets = readdirSync(path).map((name) => ({ name, content: readFileSync(join(path, name)) }));
  }, 60_000);

  it('has a script of less than 150 kB compressed', () => {
    const scripts = assets.filter(({ name }) => name.endsWith('.js'));
    expect(scripts).not.toHaveLength(0);
    const size = scripts.reduce((sum, { content }) => sum + gzipSync(content).length, 0);
    expect(size).toBeLessThan(150_000);
  });

  it('has nothing inline and loads by relative paths only, as policy and path prefix ask for', () => {
    const scripts = [...html.matchAll(/<script\b[^>]*>([\s\S]*?)<\/script>/g)];
    expect(scripts).toHaveLength(1);
    expect(scripts[0]![1]).toBe('');
    expect(html).not.toMatch(/<style|\sstyle=|\son\w+=/);
    const paths = [...html.matchAll(/\b(?:src|href)="([^"#]+)/g)].map(([, path]) => path!);
    expect(paths.length).toBeGreaterThanOrEqual(3);
    for (const path of paths) expect(path).toMatch(/^\.\//);
    const styles = assets.filter(({ name }) => name.endsWith('.css'));
    const css = styles.map(({ content }) => content.toString()).join('');
    expect(css).toContain('--paper');
    expect(css).not.toMatch(/@import|url\(/);
  });
});
