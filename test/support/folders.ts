import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

/**
 * A new empty folder for one test. All of them lie in one folder that global.ts removes when the
 * run ends, whatever became of the test.
 */
export function temporaryFolder(name = 'test'): string {
  return mkdtempSync(join(process.env.ROCKHOUR_TEST_FOLDER ?? tmpdir(), `${name}-`));
}
