import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

/** The built page: beside the daemon once compiled, else where the build puts it. */
export function pageFolder(): string {
  const above = fileURLToPath(new URL('..', import.meta.url));
  const compiled = join(above, 'page');
  return existsSync(join(compiled, 'index.html')) ? compiled : join(above, '..', 'dist', 'page');
}
