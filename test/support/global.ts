import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

/** Vitest's global set-up: the folder of all temporary folders, gone when the run ends. */
export default function setup(): () => void {
  const folder = mkdtempSync(join(tmpdir(), 'rockhour-test-'));
  process.env.ROCKHOUR_TEST_FOLDER = folder;
  return () => rmSync(folder, { recursive: true, force: true, maxRetries: 5 });
}
