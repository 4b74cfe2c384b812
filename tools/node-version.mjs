// Imported first by every tool, and kept to syntax that old versions of Node parse, so that an
// old Node says what is wrong instead of failing over a token.
import { readFileSync } from 'node:fs';

const engines = JSON.parse(readFileSync(new URL('../package.json', import.meta.url), 'utf8'))
  .engines.node;
const wanted = /^>=(\d+)\.(\d+) <(\d+)$/.exec(engines).slice(1).map(Number);
const here = process.versions.node.split('.').map(Number);

if (here[0] < wanted[0] || (here[0] === wanted[0] && here[1] < wanted[1])) {
  console.error(
    `rockhour needs Node ${wanted[0]}.${wanted[1]} or newer; this is Node ${process.versions.node}. ` +
      'Install a newer Node (Node 20 is what the project is tested with) and try again.',
  );
  process.exit(1);
}
if (here[0] >= wanted[2]) {
  console.error(
    `Note: this is Node ${process.versions.node}; the project is tested with Node 20 to ${wanted[2] - 1}.`,
  );
}
