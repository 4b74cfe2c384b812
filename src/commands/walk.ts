import { statSync } from 'node:fs';
import { setImmediate } from 'node:timers/promises';
import { RecordingReader } from '../adapters/recording/reader.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { Scan } from '../core/scan/scan.js';
import { withoutControls } from '../errors.js';
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
 */
export async function walkRecording(
  path: string,
  unit: UnitDefinition,
  otherChannels: ReadonlySet<string>,
  visit: Visit,
): Promise<RecordingReader> {
  const reader = new RecordingReader(path, unit, { otherChannels });
  const progress = startProgress(unit.id, size(path));
  try {
    let done = 0;
    let turned_ms = performance.now();
    for await (const scans of reader.batches()) {
      const step = (reader.counts.bytes - done) / scans.length;
      for (const scan of scans) {
        if ((await visit(scan)) === false) return reader;
        done += step;
        progress.update(done);
        if (performance.now() - turned_ms < TURN_MS) continue;
        // A turn of the event loop, or an interrupt at the terminal would wait for the file.
        await setImmediate();
        turned_ms = performance.now();
      }
    }
  } finally {
    progress.stop();
  }
  return reader;
}

/** What a recording held besides readings, in words; one line each, none for what did not occur. */
export function tellCounts(reader: RecordingReader): string[] {
  const { counts } = reader;
  const lines: string[] = [];
  const tell = (count: number, what: string) => {
    if (count > 0) lines.push(`${count} ${what}`);
  };
  tell(counts.repeated, 'rows replaced by a later one of the same time');
  tell(
    counts.text,
    `fields with text instead of a number, taken as missing (${counts.textExamples.join('; ')})`,
  );
  tell(counts.shortRows, 'rows with fewer fields than the header, the rest taken as missing');
  tell(counts.longRows, 'rows with more fields than the header, the surplus ignored');
  tell(counts.blankLines, 'blank lines skipped');
  tell(counts.held, 'values carried on for channels that report by exception');
  if (counts.unknownColumns.length > 0) {
    lines.push(`columns that are no channel, ignored: ${counts.unknownColumns.join(', ')}`);
  }
  if (counts.absentChannels.length > 0) {
    lines.push(`channels without a column, taken as missing: ${counts.absentChannels.join(', ')}`);
  }
  return lines.map(withoutControls);
}
