/**
 * npm run sbom: the software bill of materials of what runs (CycloneDX, JSON, to standard output).
 * `npm sbom --omit dev` leaves out a package that is also an optional peer of a development tool (yaml,
 * at this writing), so all are listed and those of development alone are taken out by npm's own mark.
 */
import { execFileSync } from 'node:child_process';
import { root } from './programs.mjs';

const args = ['sbom', '--sbom-format', 'cyclonedx', '--package-lock-only'];
const bom = JSON.parse(execFileSync('npm', args, { cwd: root, encoding: 'utf8', maxBuffer: 64e6 }));
const isOfDevelopment = ({ properties = [] }) =>
  properties.some(({ name, value }) => name === 'cdx:npm:package:development' && value === 'true');
const left_out = new Set(bom.components.filter(isOfDevelopment).map((one) => one['bom-ref']));
bom.components = bom.components.filter((one) => !left_out.has(one['bom-ref']));
bom.dependencies = bom.dependencies
  .filter(({ ref }) => !left_out.has(ref))
  .map((one) => ({ ...one, dependsOn: (one.dependsOn ?? []).filter((ref) => !left_out.has(ref)) }));
process.stdout.write(`${JSON.stringify(bom, null, 2)}\n`);
