import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    globalSetup: ['test/support/global.ts'],
    // A process per file: a native module or a signal handler of one test reaches no other.
    pool: 'forks',
    testTimeout: 30_000,
    hookTimeout: 30_000,
    coverage: { include: ['src/**/*.ts'], exclude: ['src/adapters/page/**'] },
  },
});
