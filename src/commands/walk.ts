import { statSync } from 'node:fs';
import { setImmediate } from 'node:timers/promises';
import { RecordingReader } from '../adapters/recording/reader.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { Scan } from '../core/scan/scan.js';
import { withoutControls } from '../errors.js';
import { Interrupt } from './interrupt.js';
import { startProgress } from './progress.js';

/** Longest time without a turn of the event loop [ms]. */
const TURN_MS = 100;

/** The file's size for the progress bar; a file that cannot be read is told by the reader. */
function size(path: string): number {
  return statSync(path, { throwIfNoEntry: false })?.size ?? 0;
}

/** Whether to go on after a scan. */
export type Visit = (scan: Scan) => void | boolean | Promise<void>;

/**
 * Hands every scan of a recording to `visit`, with a progress bar, until the end or until `visit`
 * gives false; then the reader, whose counts say what the recording held.
 * @throws RockhourError RECORDING_*, INTERRUPTED
 */
export async function walkRecording(
  path: string,
  unit: UnitDefinition,
  otherChannels: ReadonlySet<string>,
  visit: Visit,
): Promise<RecordingReader> {
  const reader = new RecordingReader(path, unit, { otherChannels });
  const progress = startProgress(unit.id, size(path));
  const interrupt = new Interrupt();
  interrupt.start();
  try {
    let done = 0;
    let visited = 0;
    let turned_ms = performance.now();
    for await (const scans of reader.batches()) {
      const step = (reader.counts.bytes - done) / scans.length;
      for (const scan of scans) {
        interrupt.check(() => `after ${visited} rows of ${path}`);
        if ((await visit(scan)) === false) return reader;
        visited++;
        done += step;
        progress.update(done);
        if (performance.now() - turned_ms < TURN_MS) continue;
        // A turn of the event loop, or an interrupt at the terminal would wait for the file.
        await setImmediate();
        turned_ms = performance.now();
      }
    }
  } finally {
    interrupt.stop();
    progress.stop();
  }
  return reader;
}

/** What a recording held besides readings, in words; one line each, none for what did not occur. */
export function tellCounts(reader: RecordingReader): string[] {
  const { counts } = reader;
  const lines: string[] = [];
  const tell = (count: number, one: string, many: string) => {
    if (count > 0) lines.push(`${count} ${count === 1 ? one : many}`);
  };
  if (counts.rows === 0) lines.push('the recording has a header but no rows');
  tell(
    counts.repeated,
    'row replaced by a later one of the same time',
    'rows replaced by a later one of the same time',
  );
  const examples = counts.textExamples.join('; ');
  const text = `with text instead of a number, taken as missing (${examples})`;
  tell(counts.text, `field ${text}`, `fields ${text}`);
  if (/"[+-]?\d+,\d+"/.test(examples)) lines.push('numbers need a decimal point, not a comma');
  const short = 'with fewer fields than the header, the rest taken as missing';
  tell(counts.shortRows, `row ${short}`, `rows ${short}`);
  const long = 'with more fields than the header, the surplus ignored';
  tell(counts.longRows, `row ${long}`, `rows ${long}`);
  tell(counts.blankLines, 'blank line skipped', 'blank lines skipped');
  const held = 'carried on for channels that report by exception';
  tell(counts.held, `value ${held}`, `values ${held}`);
  if (counts.unknownColumns.length > 0) {
    lines.push(`columns that are no channel, ignored: ${counts.unknownColumns.join(', ')}`);
  }
  if (counts.absentChannels.length > 0) {
    lines.push(`channels without a column, taken as missing: ${counts.absentChannels.join(', ')}`);
  }
  return lines.map(withoutControls);
}
