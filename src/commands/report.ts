import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Command } from 'commander';
import { isStoreFault, storeFailure } from '../adapters/history/database.js';
import { History } from '../adapters/history/history.js';
import { gatherReport, thinning } from '../adapters/history/reportReader.js';
import { REPORT_FORMATS, type ReportFormat, renderReport } from '../adapters/report/render.js';
import { REPORT_TABLES, type ReportTable } from '../adapters/report/reportCsv.js';
import { loadSite } from '../config/load.js';
import { findingsOf } from '../core/report/findings.js';
import type { ReportData } from '../core/report/reportData.js';
import { fileReasonOf, RockhourError } from '../errors.js';
import { chooseUnit } from './site.js';
import { parsePoint_ms } from './values.js';
import { packageVersion } from './version.js';

interface ReportOptions {
  readonly config: string;
  readonly from: string;
  readonly to?: string;
  readonly unit?: string;
  readonly at?: string;
  readonly format?: string;
  readonly table?: string;
  readonly out?: string;
}

function report(options: ReportOptions): void {
  const format = formatOf(options);
  const table = tableOf(options, format);
  const from_ms = parsePoint_ms('--from', options.from);
  const to_ms = options.to === undefined ? Date.now() : parsePoint_ms('--to', options.to);
  if (!(to_ms > from_ms))
    throw new RockhourError(
      'USAGE',
      `--to ${options.to ?? 'now'} is not after --from ${options.from}`,
    );
  const profiles_at_ms = (options.at?.split(',') ?? []).map((text) => parsePoint_ms('--at', text));
  const site = loadSite(options.config);
  const unit = chooseUnit(site, options.unit);
  const history = new History(join(site.store.folder, 'history.sqlite'), site.store);
  try {
    history.startToRead();
    const data = gatherReport(history, unit, {
      ...{
        site: site.name,
        version: packageVersion(),
        from_ms,
        to_ms,
        made_ms: Date.now(),
        profiles_at_ms,
      },
      ...thinning(site.store, Date.now()),
    });
    if (data.readings.scans === 0)
      throw new RockhourError(
        'USAGE',
        `unit ${unit.id} has no estimates from ${data.from} to ${data.to} in ${site.store.folder}`,
      );
    give(renderReport(data, format, table), options.out);
    if (options.out !== undefined) tell(data, options.out);
  } catch (thrown) {
    throw isStoreFault(thrown) ? storeFailure(`reading ${site.store.folder}`, thrown) : thrown;
  } finally {
    history.stop();
  }
}

function formatOf({ format, out }: ReportOptions): ReportFormat {
  const ending = REPORT_FORMATS.find((one) => out?.toLowerCase().endsWith(`.${one}`));
  const chosen = format ?? ending ?? 'html';
  if (REPORT_FORMATS.includes(chosen as ReportFormat)) return chosen as ReportFormat;
  throw new RockhourError(
    'USAGE',
    `--format is ${JSON.stringify(format)}; expected ${REPORT_FORMATS.join(', ')}`,
  );
}

function tableOf({ table }: ReportOptions, format: ReportFormat): ReportTable {
  if (table === undefined) return 'runs';
  if (format !== 'csv')
    throw new RockhourError('USAGE', `--table goes with --format csv; ${format} has all of them`);
  if (REPORT_TABLES.includes(table as ReportTable)) return table as ReportTable;
  throw new RockhourError(
    'USAGE',
    `--table is ${JSON.stringify(table)}; expected ${REPORT_TABLES.join(', ')}`,
  );
}

function give(text: string, out: string | undefined): void {
  if (out === undefined) {
    process.stdout.write(text);
    return;
  }
  try {
    writeFileSync(out, text);
  } catch (thrown) {
    throw new RockhourError('OUTPUT_UNWRITABLE', `writing ${out}: ${fileReasonOf(thrown)}`, {
      cause: thrown,
    });
  }
}

/** The findings in a line each, so that a person knows whether to open the file. */
function tell(data: ReportData, out: string): void {
  const lines = findingsOf(data).map(
    ({ level, subject, title }) => `  ${level}: ${subject}: ${title}`,
  );
  process.stderr.write(`${out}: ${data.cycles.length} runs from ${data.from} to ${data.to}\n`);
  process.stderr.write(`${lines.join('\n')}\n`);
}

export function register(program: Command): void {
  program
    .command('report')
    .description('what happened to the beds in a span of time, for maintenance: findings first')
    .requiredOption(
      '--config <file>',
      'configuration of the site (YAML), whose local store is read',
    )
    .requiredOption('--from <time>', 'beginning, ISO 8601 with offset or seconds since 1970')
    .option('--to <time>', 'end; now unless told')
    .option('--unit <id>', 'unit asked for; needed where there are several')
    .option(
      '--at <times>',
      'times whose profiles are drawn, with commas; the last runs unless told',
    )
    .option('--format <format>', 'html, json or csv; by the ending of --out, else html')
    .option(
      '--table <table>',
      'of csv: runs (default), findings, indicators, thermocouples, events',
    )
    .option('--out <file>', 'file to write; standard output unless told')
    .action(report);
}
