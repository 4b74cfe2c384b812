import { defineConfig } from 'vitest/config';

/** Tests that hold how long something took, and would find it longer beside another test. */
const TIMED = [
  'test/daemon/{asking,kill,questions}.test.ts',
  'test/house/badInputRecording.test.ts',
];
/** Tests that start processes, brokers, databases or browsers. */
const PROCESSES = ['test/{adapters,chain,commands,daemon,house}/**/*.test.ts'];

/** A deep run takes its time. */
const limit_ms = 30_000 * Number(process.env.ROCKHOUR_TEST_DEPTH ?? 1);

/** A process per file: a native module or a signal handler of one test reaches no other. */
const shared = {
  globalSetup: 'test/support/global.ts',
  pool: 'forks',
  testTimeout: limit_ms,
  hookTimeout: limit_ms,
  // A busy machine may need seconds for what a person would see at once.
  expect: { poll: { timeout: 10_000 } },
} as const;

export default defineConfig({
  test: {
    coverage: { include: ['src/**/*.ts'], exclude: ['src/adapters/page/**'] },
    projects: [
      // These two run together, on as many cores as a small machine has: one calculates while the
      // other waits for a process or a clock.
      {
        test: {
          ...shared,
          name: 'processes',
          include: PROCESSES,
          exclude: TIMED,
          maxWorkers: 2,
          sequence: { groupOrder: 0 },
        },
      },
      {
        test: {
          ...shared,
          name: 'calculation',
          include: ['test/**/*.test.ts'],
          exclude: PROCESSES,
          // Pure functions: files share a process, and with it what was loaded, compiled and built.
          isolate: false,
          setupFiles: ['test/support/eachFile.ts'],
          maxWorkers: 2,
          sequence: { groupOrder: 0 },
        },
      },
      {
        test: {
          ...shared,
          name: 'timed',
          include: TIMED,
          maxWorkers: 1,
          sequence: { groupOrder: 1 },
        },
      },
    ],
  },
});
