import { closeSync, existsSync, openSync, readSync, statSync } from 'node:fs';

/** SQLite, "WAL-mode File Format": sizes of the header of the file and of a frame [bytes]. */
const [HEADER, FRAME_HEADER] = [32, 24];
/** Without its last bit, which tells the order of bytes that checksums are made in. */
const MAGIC = 0x377f0682;

/**
 * Commits that stand in a write-ahead log behind a frame that is broken. SQLite reads it up to the first
 * frame whose checksum is wrong and takes that for its end: it loses all behind without a word.
 *
 * @param wal of a database whose every commit is synced: after a power cut one is behind at most
 * @returns Infinity where the header is broken, which hides all
 */
export function commitsBehindBreak(wal: string): number {
  const size = existsSync(wal) ? statSync(wal).size : 0;
  if (size <= HEADER + FRAME_HEADER) return 0;
  const handle = openSync(wal, 'r');
  try {
    const header = Buffer.alloc(HEADER);
    readSync(handle, header, 0, HEADER, 0);
    const page = header.readUInt32BE(8);
    const magic = header.readUInt32BE(0);
    const isBig = (magic & 1) === 1;
    let sums = checksum(header.subarray(0, 24), [0, 0], isBig);
    const isHeader = (magic & ~1) >>> 0 === MAGIC && isPageSize(page) && holds(header, 24, sums);
    if (!isHeader) return Number.POSITIVE_INFINITY;
    const frame = Buffer.alloc(FRAME_HEADER + page);
    let [isSound, behind] = [true, 0];
    for (let at = HEADER; at + frame.length <= size; at += frame.length) {
      readSync(handle, frame, 0, frame.length, at);
      // Behind the newest frames those of before may stand, with another salt.
      const isOfNow = frame.compare(header, 16, 24, 8, 16) === 0;
      if (isSound) {
        const next = checksum(frame.subarray(0, 8), sums, isBig);
        const whole = checksum(frame.subarray(FRAME_HEADER), next, isBig);
        if (isOfNow && holds(frame, 16, whole)) sums = whole;
        else isSound = false;
      } else if (isOfNow && frame.readUInt32BE(4) !== 0) behind++;
    }
    return behind;
  } finally {
    closeSync(handle);
  }
}

type Sums = readonly [number, number];

const isPageSize = (bytes: number) =>
  bytes >= 512 && bytes <= 65_536 && (bytes & (bytes - 1)) === 0;

const holds = (bytes: Buffer, at: number, [one, two]: Sums) =>
  bytes.readUInt32BE(at) === one && bytes.readUInt32BE(at + 4) === two;

/** s0 += x(i) + s1, s1 += x(i+1) + s0, over words of 32 bits in their order, modulo 2^32. */
function checksum(bytes: Buffer, [first, second]: Sums, isBig: boolean): Sums {
  let [s0, s1] = [first | 0, second | 0];
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.length);
  for (let i = 0; i < bytes.length; i += 8) {
    s0 = (s0 + view.getInt32(i, !isBig) + s1) | 0;
    s1 = (s1 + view.getInt32(i + 4, !isBig) + s0) | 0;
  }
  return [s0 >>> 0, s1 >>> 0];
}
