import type { Command } from 'commander';
import { siteJsonSchema } from '../config/jsonSchema.js';
import { ConfigFault, loadSite } from '../config/load.js';
import { referenceText } from '../config/reference.js';
import { RockhourError } from '../errors.js';
import { factsAsText } from './check/print.js';
import { siteNotes } from './check/siteNotes.js';
import { unitFacts } from './check/unitFacts.js';

interface CheckOptions {
  readonly config?: string;
  readonly json?: boolean;
  readonly schema?: boolean;
  readonly explain?: boolean;
}

/** `rockhour check`: all faults of a configuration at once, or the facts that follow from it. */
export function register(program: Command): void {
  program
    .command('check')
    .description('lists all faults of a configuration, or what follows from a sound one')
    .option('--config <file>', 'site file (YAML)')
    .option('--json', 'faults or facts as JSON on standard output')
    .option('--schema', 'prints the JSON Schema of site files, for editors')
    .option('--explain', 'prints the reference of all keys, in Markdown')
    .action((options: CheckOptions) => {
      process.stdout.write(`${answer(options)}\n`);
    });
}

function answer(options: CheckOptions): string {
  const asked = [options.config, options.schema, options.explain].filter(
    (one) => one !== undefined,
  );
  if (asked.length > 1) {
    throw new RockhourError('USAGE', '--config, --schema and --explain do not go together');
  }
  if (options.schema) return JSON.stringify(siteJsonSchema(), null, 2);
  if (options.explain) return referenceText().trimEnd();
  const { config, json } = options;
  if (config === undefined) {
    throw new RockhourError('USAGE', 'check needs --config, --schema or --explain');
  }
  try {
    const site = loadSite(config);
    const units = site.units.map(unitFacts);
    return json
      ? JSON.stringify(
          { file: config, sound: true, name: site.name, notes: siteNotes(site), units },
          null,
          2,
        )
      : factsAsText(config, site, units);
  } catch (error) {
    // With --json the faults are the answer; the message on standard error stays as it is.
    if (json && error instanceof ConfigFault) {
      const { faults, more_may_follow } = error;
      const found = { file: config, sound: false, more_may_follow, faults };
      process.stdout.write(`${JSON.stringify(found, null, 2)}\n`);
    }
    throw error;
  }
}
