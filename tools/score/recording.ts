import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { dirname } from 'node:path';
import type { ScanReadings } from '../../test/plant/truth.js';

/** True hours at one power, as of a scan. */
export interface HoursTruth {
  readonly scan: number;
  readonly power_W: number;
  readonly hours: number;
}

interface Header {
  readonly start_s: number;
  readonly period_s: number;
  readonly scans: number;
  /** Columns in kelvin, kept in steps of 1/80 K as a converter of 16 bits would. */
  readonly temperatures: readonly string[];
  readonly others: readonly string[];
  readonly truths: readonly string[];
  readonly hours: readonly HoursTruth[];
}

const STEPS_PER_K = 80;
const MISSING = 65535;

/** Readings and truth of one run of the plant, compact in memory and on disk. */
export class Recording {
  private readonly columns: Map<string, readonly [table: 0 | 1, column: number]>;
  private readonly truthColumns: Map<string, number>;

  private constructor(
    readonly header: Header,
    private readonly temperatures: Uint16Array,
    private readonly others: Float32Array,
    private readonly truths: Float32Array,
  ) {
    this.columns = new Map();
    header.temperatures.forEach((id, i) => {
      this.columns.set(id, [0, i]);
    });
    header.others.forEach((id, i) => {
      this.columns.set(id, [1, i]);
    });
    this.truthColumns = new Map(header.truths.map((id, i) => [id, i]));
  }

  /** Source time of a scan [ms since 1970]. */
  time_ms(scan: number): number {
    return (this.header.start_s + (scan + 1) * this.header.period_s) * 1000;
  }

  /** Reading of a channel at a scan, SI units; NaN = missing. */
  reading(id: string, scan: number): number {
    const place = this.columns.get(id);
    if (!place) throw new RangeError(`recording has no column ${id}`);
    const [table, column] = place;
    if (table === 1) return this.others[scan * this.header.others.length + column]!;
    const steps = this.temperatures[scan * this.header.temperatures.length + column]!;
    return steps === MISSING ? Number.NaN : steps / STEPS_PER_K;
  }

  truth(id: string, scan: number): number {
    const column = this.truthColumns.get(id);
    if (column === undefined) throw new RangeError(`recording has no truth ${id}`);
    return this.truths[scan * this.header.truths.length + column]!;
  }

  static make(
    scans: readonly ScanReadings[],
    truths: readonly (readonly number[])[],
    head: Pick<Header, 'start_s' | 'period_s' | 'truths' | 'hours'> & {
      readonly temperatures: readonly string[];
      readonly others: readonly string[];
    },
  ): Recording {
    const temperatures = new Uint16Array(scans.length * head.temperatures.length);
    const others = new Float32Array(scans.length * head.others.length);
    scans.forEach(({ readings }, n) => {
      head.temperatures.forEach((id, i) => {
        const steps = Math.round(readings[id]! * STEPS_PER_K);
        temperatures[n * head.temperatures.length + i] =
          steps >= 0 && steps < MISSING ? steps : MISSING;
      });
      head.others.forEach((id, i) => {
        others[n * head.others.length + i] = readings[id]!;
      });
    });
    const flat = Float32Array.from(truths.flat());
    return new Recording({ ...head, scans: scans.length }, temperatures, others, flat);
  }

  save(file: string): void {
    mkdirSync(dirname(file), { recursive: true });
    // Padded so that the arrays behind it are aligned.
    const text = JSON.stringify(this.header);
    const head = Buffer.from(text.padEnd(text.length + ((4 - (text.length % 4)) % 4)));
    const length = Buffer.alloc(4);
    length.writeUInt32LE(head.length);
    const parts = [this.temperatures, this.others, this.truths].map((a) =>
      Buffer.from(a.buffer, a.byteOffset, a.byteLength),
    );
    const pad = Buffer.alloc((4 - (parts[0]!.length % 4)) % 4);
    const [temperatures, others, truths] = parts as [Buffer, Buffer, Buffer];
    writeFileSync(`${file}.part`, Buffer.concat([length, head, temperatures, pad, others, truths]));
    renameSync(`${file}.part`, file);
  }

  static load(file: string): Recording | null {
    if (!existsSync(file)) return null;
    const bytes = new Uint8Array(readFileSync(file)).buffer;
    const length = new DataView(bytes).getUint32(0, true);
    const header = JSON.parse(new TextDecoder().decode(new Uint8Array(bytes, 4, length))) as Header;
    let at = 4 + length;
    const temperatures = new Uint16Array(bytes, at, header.scans * header.temperatures.length);
    at += 4 * Math.ceil(temperatures.byteLength / 4);
    const others = new Float32Array(bytes, at, header.scans * header.others.length);
    at += others.byteLength;
    const truths = new Float32Array(bytes, at, header.scans * header.truths.length);
    return new Recording(header, temperatures, others, truths);
  }
}
