import { Instruments, meterFactor } from './instruments.js';
import { trueHours } from './lookAhead.js';
import { MachineRoom } from './machineRoom.js';
import type { PlantTruth, ScanReadings, Segment, TrueHours, TruthOptions } from './truthTypes.js';

export type * from './truthTypes.js';

/** 2025-01-01T00:00:00Z. */
const DEFAULT_START_S = 1735689600;

/** The plant that knows the truth: stores, machine and instruments. */
export class Truth {
  readonly room: MachineRoom;
  private readonly instruments: Instruments;
  private readonly start_s: number;

  constructor(
    private readonly options: TruthOptions,
    from?: Truth,
  ) {
    this.start_s = options.start_s ?? DEFAULT_START_S;
    this.room = from ? from.room.clone(options) : new MachineRoom(options, this.start_s);
    this.instruments = from
      ? from.instruments.clone()
      : new Instruments(options.geometry, options.seed);
  }

  /** A copy that runs on by itself, with other sensor faults or changes to come if given. */
  clone(also: Pick<TruthOptions, 'faults' | 'changes'> = {}): Truth {
    return new Truth({ ...this.options, ...also }, this);
  }

  get geometry() {
    return this.options.geometry;
  }
  get draw() {
    return this.room.draw;
  }
  get stores() {
    return this.room.stores;
  }
  /** Why the last segment ended early, null if it did not. */
  get stoppedBy() {
    return this.room.stoppedBy;
  }
  /** Seconds since the start, and since 1970. */
  get elapsed_s(): number {
    return this.room.elapsed_s;
  }
  get time_s(): number {
    return this.start_s + this.room.elapsed_s;
  }

  /**
   * Runs a schedule. One scan and one truth at the end of each scan period, the start included in
   * neither; a segment is cut to whole scan periods. When a limit of the machine stops a segment
   * the rest of it stands and `stoppedBy` says why.
   * @param each called instead of collecting, for long runs
   */
  run(
    segments: readonly Segment[],
    each?: (scan: ScanReadings, truth: PlantTruth, plant: Truth) => void,
  ): { scans: ScanReadings[]; truths: PlantTruth[] } {
    const scans: ScanReadings[] = [];
    const truths: PlantTruth[] = [];
    const period = this.geometry.scan_period_s;
    for (const segment of segments) {
      this.room.stoppedBy = null;
      const count = Math.round(segment.duration_s / period);
      for (let i = 0; i < count; i++) {
        this.advance(segment, period);
        const scan = this.scan();
        const truth = this.truth();
        if (each) each(scan, truth, this);
        else {
          scans.push(scan);
          truths.push(truth);
        }
      }
    }
    return { scans, truths };
  }

  /** Advances by `duration_s` under one command; stands once the command has been stopped. */
  advance(command: Segment, duration_s: number): void {
    const parts = Math.max(1, Math.ceil(duration_s / this.room.step_s - 1e-9));
    const dt_s = duration_s / parts;
    for (let i = 0; i < parts; i++) {
      const stopped = this.room.stoppedBy !== null;
      this.room.step(stopped ? { mode: 'stand', duration_s } : command, dt_s);
      this.instruments.follow(this.room, dt_s);
    }
  }

  /** Reads all sensors now; the noise advances, so one call per scan. */
  scan(): ScanReadings {
    return {
      time_s: this.time_s,
      readings: this.instruments.read(this.room, this.options.faults ?? []),
    };
  }

  truth(): PlantTruth {
    const { room } = this;
    return {
      time_s: this.time_s,
      mode: room.mode,
      flow_kg_s: room.flow_kg_s,
      power_W: room.power_W,
      ambient_K: room.ambient_K(),
      meter_factor: meterFactor(room),
      stores: Object.fromEntries(room.stores.map((s) => [s.geometry.id, s.truth()])),
    };
  }

  /** True hours at constant net power from now on; see `trueHours`. */
  hoursAt(power_W: number, step_s?: number, horizon_h?: number): TrueHours {
    return trueHours(this.room, power_W, step_s, horizon_h);
  }
}

/** A plant drawn from a seed; see TruthOptions. */
export function createTruth(options: TruthOptions): Truth {
  return new Truth(options);
}
