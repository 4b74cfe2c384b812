import { defineConfig } from 'vitest/config';

/** Tests that start processes, brokers, databases or browsers, some with limits of time. */
const PROCESSES = ['test/{adapters,chain,commands,daemon,house}/**/*.test.ts'];

/** A process per file: a native module or a signal handler of one test reaches no other. */
const shared = {
  globalSetup: 'test/support/global.ts',
  pool: 'forks',
  testTimeout: 30_000,
  hookTimeout: 30_000,
} as const;

export default defineConfig({
  test: {
    coverage: { include: ['src/**/*.ts'], exclude: ['src/adapters/page/**'] },
    projects: [
      {
        test: {
          ...shared,
          name: 'processes',
          include: PROCESSES,
          maxWorkers: 1,
          sequence: { groupOrder: 0 },
        },
      },
      {
        test: {
          ...shared,
          name: 'calculation',
          include: ['test/**/*.test.ts'],
          exclude: PROCESSES,
          // Nothing here waits for a clock: as many as a small machine has cores.
          maxWorkers: 2,
          sequence: { groupOrder: 1 },
        },
      },
    ],
  },
});
