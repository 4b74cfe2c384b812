import { resolve } from 'node:path';
import { defineConfig } from 'vite';

/** The page as plain files under dist/page; every path in it is relative, so it serves any prefix. */
export default defineConfig({
  root: import.meta.dirname,
  base: './',
  oxc: { jsx: { runtime: 'automatic', importSource: 'preact' } },
  build: {
    outDir: resolve(import.meta.dirname, '../../../dist/page'),
    emptyOutDir: true,
    target: 'es2022',
    // The policy of the server forbids data: URLs, as inlined assets would be.
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
  },
});
