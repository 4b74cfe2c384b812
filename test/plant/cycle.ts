import type { GasCycleGeometry, HeaterGeometry, PlantGeometry } from './geometry.js';

/** What the machine draw of a seed changes. */
export interface MachineDraw {
  readonly compressor_points: number;
  readonly expander_points: number;
  /** Share of the pressure lost in the loop at rated flow; null: the geometry's own. */
  readonly loop_pressure_loss: number | null;
  /** How much of that loss follows the square of the flow; the rest is constant. */
  readonly loss_follows_flow: number;
  /** Heat loss of each pipe between machine and store [W/K]. */
  readonly pipe_loss_W_K: number;
}

/** Gas temperatures at the ends of the two stores for one direction and its specific work. */
export interface CyclePoint {
  /** Gas sent into the hot and the cold store [K]. */
  readonly hotInlet_K: number;
  readonly coldInlet_K: number;
  /** Net electricity at the connection point, positive while charging [W]. */
  readonly power_W: number;
}

const ARGON_CP = 520.333;
/** (gamma - 1)/gamma = R/cp of a monatomic gas. */
const EXPONENT = 0.4;

function after(T: number, ratio: number, exponent: number): number {
  return T * ratio ** exponent;
}

/**
 * Closed argon cycle between two stores. T rises by ratio^(R/(cp eta)) over a compressor and falls
 * by ratio^(R eta/cp) over an expander. The two pressures are those of the compressor; half of the
 * loop's loss lies on each level, so that the expander has their ratio times (1 - loss/2)^2.
 * Coolers bring gas down to ambient + approach: while charging before each machine, while
 * discharging behind each.
 */
export class GasCycle {
  /** Beyond this the loop's loss law means nothing [kg/s]. */
  readonly flowEnd_kg_s: number;
  constructor(
    private readonly machine: GasCycleGeometry,
    private readonly draw: MachineDraw,
    private readonly ratedFlow_kg_s: number,
  ) {
    this.flowEnd_kg_s = 4 * ratedFlow_kg_s;
  }

  point(
    charging: boolean,
    flow: number,
    hotOutlet_K: number,
    coldOutlet_K: number,
    ambient_K: number,
  ): CyclePoint {
    const { machine, draw } = this;
    const atRated = draw.loop_pressure_loss ?? machine.loop_pressure_loss;
    const relative = flow / this.ratedFlow_kg_s;
    const loss =
      atRated * (1 - draw.loss_follows_flow + draw.loss_follows_flow * relative * relative);
    const etaC = machine.compressor_polytropic_efficiency + draw.compressor_points;
    const etaE = machine.expander_polytropic_efficiency + draw.expander_points;
    const nominal = machine.high_pressure_Pa / machine.low_pressure_Pa;
    const up = nominal;
    const down = nominal * (1 - loss / 2) ** 2;
    const cooled = (T: number) => Math.min(T, ambient_K + machine.cooler_approach_K);
    const pipe = (T: number) => {
      if (draw.pipe_loss_W_K === 0) return T;
      return ambient_K + (T - ambient_K) * Math.exp(-draw.pipe_loss_W_K / (flow * ARGON_CP));
    };
    const hotGas = pipe(hotOutlet_K);
    const coldGas = pipe(coldOutlet_K);
    if (charging) {
      const beforeCompressor = cooled(coldGas);
      const compressed = after(beforeCompressor, up, EXPONENT / etaC);
      const beforeExpander = cooled(hotGas);
      const expanded = after(beforeExpander, down, -EXPONENT * etaE);
      const work = ARGON_CP * (compressed - beforeCompressor - (beforeExpander - expanded));
      return {
        hotInlet_K: pipe(compressed),
        coldInlet_K: pipe(expanded),
        power_W: (flow * work) / machine.motor_efficiency + machine.auxiliary_running_W,
      };
    }
    const compressed = after(coldGas, up, EXPONENT / etaC);
    const expanded = after(hotGas, down, -EXPONENT * etaE);
    const work = ARGON_CP * (hotGas - expanded - (compressed - coldGas));
    return {
      hotInlet_K: cooled(compressed),
      coldInlet_K: cooled(expanded),
      power_W: -(flow * work * machine.generator_efficiency - machine.auxiliary_running_W),
    };
  }
}

/** Heater and engine at a single store; the table of efficiency is read by straight lines. */
export class HeaterCycle {
  readonly flowEnd_kg_s = Number.POSITIVE_INFINITY;
  constructor(
    private readonly machine: HeaterGeometry,
    private readonly heatCapacity: (T: number) => number,
  ) {}

  point(charging: boolean, flow: number, hotOutlet_K: number): CyclePoint {
    const { machine } = this;
    if (charging) {
      const cp = this.heatCapacity((machine.charge_inlet_K + hotOutlet_K) / 2);
      const heat = flow * cp * (machine.charge_inlet_K - hotOutlet_K);
      return {
        hotInlet_K: machine.charge_inlet_K,
        coldInlet_K: Number.NaN,
        power_W: heat / machine.charge_efficiency + machine.auxiliary_running_W,
      };
    }
    const cp = this.heatCapacity((machine.return_K + hotOutlet_K) / 2);
    const heat = flow * cp * (hotOutlet_K - machine.return_K);
    return {
      hotInlet_K: machine.return_K,
      coldInlet_K: Number.NaN,
      power_W: -(heat * this.efficiencyAt(hotOutlet_K) - machine.auxiliary_running_W),
    };
  }

  private efficiencyAt(T: number): number {
    const { outlet_K: x, efficiency: y } = this.machine;
    let i = 0;
    while (i < x.length - 2 && T > x[i + 1]!) i++;
    const share = Math.min(Math.max((T - x[i]!) / (x[i + 1]! - x[i]!), 0), 1);
    return y[i]! + share * (y[i + 1]! - y[i]!);
  }
}

export type Cycle = GasCycle | HeaterCycle;

/**
 * Flow at which the machine's net power is `power_W` (positive charges): secant steps from a
 * guess, needed because losses follow the flow. NaN where no flow delivers that power.
 */
export function flowForPower(
  cycle: Cycle,
  charging: boolean,
  power_W: number,
  hotOutlet_K: number,
  coldOutlet_K: number,
  ambient_K: number,
  guess_kg_s: number,
): number {
  const at = (m: number) => cycle.point(charging, m, hotOutlet_K, coldOutlet_K, ambient_K).power_W;
  let a = guess_kg_s > 0 ? guess_kg_s : 1;
  let fa = at(a) - power_W;
  let b = a * 1.05;
  for (let i = 0; i < 25; i++) {
    const fb = at(b) - power_W;
    if (Math.abs(fb) < 1e-3) return b > 0 ? b : Number.NaN;
    const slope = (fb - fa) / (b - a);
    // Power must grow with flow in its own sense, or more flow brings nothing.
    if (!(charging ? slope > 0 : slope < 0)) return Number.NaN;
    a = b;
    fa = fb;
    b = Math.min(Math.max(b - fb / slope, a / 5), a * 5);
    if (!(b > 1e-9 && b < cycle.flowEnd_kg_s)) return Number.NaN;
  }
  return Number.NaN;
}

/** Direct use of a geometry's machine. */
export function cycleOf(
  geometry: PlantGeometry,
  draw: MachineDraw,
  heatCapacity: (T: number) => number,
): Cycle {
  return geometry.machine.kind === 'gas_cycle'
    ? new GasCycle(geometry.machine, draw, geometry.rated_flow_kg_s)
    : new HeaterCycle(geometry.machine, heatCapacity);
}
