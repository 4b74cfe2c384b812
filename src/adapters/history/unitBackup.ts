import { createHash } from 'node:crypto';
import { gunzipSync, gzipSync } from 'node:zlib';
import { reasonOf } from '../../errors.js';
import type { Checkpoint } from './checkpoints.js';
import type { JournalEntry } from './journal.js';
import { fromSafeText, toSafeText } from './safeText.js';

const FORMAT = 'rockhour unit backup';
/** Of the file; raised where an older rockhour could not read a newer file. */
export const BACKUP_FORMAT_VERSION = 1;
/** A hundred times a unit of two stores with three tubes each; more is none, or hostile [bytes]. */
export const MOST_BACKUP_BYTES = 32 * 1024 * 1024;
const MOST_TEXT_BYTES = 4 * MOST_BACKUP_BYTES;

/** The state of one unit, and what tells where it is from. */
export interface UnitBackup extends Checkpoint {
  readonly unit: string;
  readonly site: string;
  /** Of the rockhour that wrote it. */
  readonly version: string;
  /** When it was made, ISO 8601 UTC by that machine's clock. */
  readonly made: string;
  /** The entry of the journal that `journal_seq` names: another journal has another one there. */
  readonly anchor: JournalEntry | null;
}

/**
 * A backup as a file: two lines, gzipped. The first has the format, its version and the SHA-256 of the
 * second, which has the content.
 */
export function packBackup(backup: UnitBackup): Buffer {
  const content = toSafeText({ ...backup });
  const head = { format: FORMAT, format_version: BACKUP_FORMAT_VERSION, sha256: printOf(content) };
  return gzipSync(`${JSON.stringify(head)}\n${content}\n`);
}

/** @throws RangeError that says what is wrong with the file, in words that go on after 'the file' */
export function unpackBackup(file: Uint8Array): UnitBackup {
  const [first = '', content = '', ...rest] = textOf(file).split('\n');
  const head = headOf(first);
  if (head.format_version > BACKUP_FORMAT_VERSION) {
    throw new RangeError(
      `is of a newer rockhour: format ${head.format_version}, this one reads ${BACKUP_FORMAT_VERSION}`,
    );
  }
  if (rest.length !== 1 || rest[0] !== '' || printOf(content) !== head.sha256)
    throw new RangeError('is damaged: its content is not what its SHA-256 says');
  let value: unknown;
  try {
    value = fromSafeText(content);
  } catch (thrown) {
    throw new RangeError(`cannot be read: ${reasonOf(thrown)}`);
  }
  return checked(value);
}

function textOf(file: Uint8Array): string {
  if (file.length > MOST_BACKUP_BYTES)
    throw new RangeError(`is larger than ${MOST_BACKUP_BYTES} bytes`);
  try {
    return gunzipSync(file, { maxOutputLength: MOST_TEXT_BYTES }).toString('utf8');
  } catch (thrown) {
    throw new RangeError(`is no backup, or was cut off or damaged (${reasonOf(thrown)})`);
  }
}

function headOf(line: string): { format_version: number; sha256: string } {
  let head: Record<string, unknown> | null = null;
  try {
    head = JSON.parse(line) as Record<string, unknown> | null;
  } catch {
    // Told below, as any other first line that is none.
  }
  if (head?.format !== FORMAT) throw new RangeError('is no backup of a unit');
  const { format_version, sha256 } = head;
  if (!Number.isInteger(format_version) || typeof sha256 !== 'string')
    throw new RangeError('has a first line that does not say its version and SHA-256');
  return { format_version: format_version as number, sha256 };
}

function printOf(content: string): string {
  return createHash('sha256').update(content).digest('hex');
}

function checked(value: unknown): UnitBackup {
  const backup = value as Partial<Record<keyof UnitBackup, unknown>> | null;
  const isText = (key: keyof UnitBackup) => typeof backup?.[key] === 'string';
  const isCount = (key: keyof UnitBackup) => Number.isSafeInteger(backup?.[key]);
  const wrong = [
    ...(['unit', 'site', 'version', 'made'] as const).filter((key) => !isText(key)),
    ...(['time_ms', 'journal_seq'] as const).filter((key) => !isCount(key)),
    ...(isObject(backup?.image) ? [] : ['image']),
    ...(backup?.anchor === null || isObject(backup?.anchor) ? [] : ['anchor']),
  ];
  if (wrong.length > 0) throw new RangeError(`lacks ${wrong.join(', ')}`);
  return value as UnitBackup;
}

const isObject = (value: unknown) => typeof value === 'object' && value !== null;
