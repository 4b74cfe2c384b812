import type { Path } from '../faults.js';
import { resolveFluid } from '../resolveStore.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross, firstNotAscending } from './cross.js';

/** The gas in a store and on its side of the machine is the same: more apart is two plants in one file. */
const PRESSURE_TOLERANCE = 0.1;

export function machineFaults(unit: UnitBlock, path: Path): CrossFault[] {
  return unit.machine.kind === 'gas_cycle' ? cycleFaults(unit, path) : tableFaults(unit, path);
}

type Fluid = UnitBlock['stores'][number]['bed']['fluid'];
const fluidName = (fluid: Fluid): string => (typeof fluid === 'string' ? fluid : fluid.name);

function fluidFaults(
  unit: UnitBlock,
  path: Path,
  machineKey: 'gas' | 'fluid',
  fluid: Fluid,
): CrossFault[] {
  const at: Path = [...path, 'machine', machineKey];
  return unit.stores.flatMap((store, s) =>
    fluidName(store.bed.fluid) === fluidName(fluid)
      ? []
      : [
          cross(
            [...path, 'stores', s, 'bed', 'fluid'],
            fluidName(store.bed.fluid),
            `the fluid of the machine, ${fluidName(fluid)}`,
            { others: [at] },
          ),
        ],
  );
}

function cycleFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const m = unit.machine;
  if (m.kind !== 'gas_cycle') return [];
  const at: Path = [...path, 'machine'];
  const kinds = unit.stores.map((_, s): Path => [...path, 'stores', s, 'kind']);
  const faults = fluidFaults(unit, path, 'gas', m.gas);
  if (resolveFluid(m.gas).phase !== 'gas') {
    faults.push(cross([...at, 'gas'], fluidName(m.gas), 'a gas: a liquid does no work in a cycle'));
  }
  if (m.low_pressure_bar >= m.high_pressure_bar) {
    faults.push(
      cross(
        [...at, 'low_pressure_bar'],
        m.low_pressure_bar,
        `less than high_pressure_bar (${m.high_pressure_bar})`,
        {
          others: [[...at, 'high_pressure_bar']],
        },
      ),
    );
  } else if (
    (m.high_pressure_bar / m.low_pressure_bar) * (1 - m.loop_pressure_loss / 2) ** 2 <=
    1
  ) {
    faults.push(
      cross(
        [...at, 'loop_pressure_loss'],
        m.loop_pressure_loss,
        'a loss that leaves the expander a pressure to work with: (high/low) (1 - loss/2)^2 above 1',
        {
          others: [
            [...at, 'high_pressure_bar'],
            [...at, 'low_pressure_bar'],
          ],
        },
      ),
    );
  } else {
    unit.stores.forEach((store, s) => {
      const key = store.kind === 'hot' ? 'high_pressure_bar' : 'low_pressure_bar';
      if (Math.abs(store.pressure_bar / m[key] - 1) <= PRESSURE_TOLERANCE) return;
      faults.push(
        cross(
          [...path, 'stores', s, 'pressure_bar'],
          store.pressure_bar,
          `the pressure of its side of the machine, machine.${key} (${m[key]} bar)`,
          { others: [[...at, key], kinds[s]!] },
        ),
      );
    });
  }
  const count = (kind: string) => unit.stores.filter((s) => s.kind === kind).length;
  if (unit.stores.length === 1 && (count('hot') === 0 || count('cold') === 0)) {
    const missing = count('hot') === 0 ? 'hot' : 'cold';
    faults.push({
      ...cross(
        [...path, 'stores'],
        undefined,
        'a hot and a cold store: a gas cycle works between the two',
        {
          others: [[...at, 'kind'], ...kinds],
        },
      ),
      found: `no ${missing} store`,
    });
  }
  return faults;
}

function tableFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const m = unit.machine;
  if (m.kind !== 'efficiency_table') return [];
  const at: Path = [...path, 'machine'];
  const faults = fluidFaults(unit, path, 'fluid', m.fluid);
  const bad = firstNotAscending(m.outlet_degC);
  if (bad >= 0) {
    faults.push(
      cross(
        [...at, 'outlet_degC', bad],
        m.outlet_degC[bad],
        `a temperature above the one before it (${m.outlet_degC[bad - 1]} degC)`,
      ),
    );
  }
  if (m.efficiency.length !== m.outlet_degC.length) {
    faults.push(
      cross(
        [...at, 'efficiency'],
        m.efficiency,
        `as many values as outlet_degC has (${m.outlet_degC.length})`,
        {
          others: [[...at, 'outlet_degC']],
        },
      ),
    );
  }
  if (m.return_degC >= m.charge_inlet_degC) {
    faults.push(
      cross(
        [...at, 'return_degC'],
        m.return_degC,
        `less than charge_inlet_degC (${m.charge_inlet_degC})`,
        {
          others: [[...at, 'charge_inlet_degC']],
        },
      ),
    );
  }
  if (unit.stores.length !== 1 || unit.stores[0]!.kind !== 'hot') {
    faults.push({
      ...cross([...path, 'stores'], undefined, 'a single hot store beside an efficiency table', {
        others: [
          [...at, 'kind'],
          ...unit.stores.map((_, s): Path => [...path, 'stores', s, 'kind']),
        ],
      }),
      found: unit.stores.map((s) => `${s.kind} store ${s.id}`).join(' and '),
    });
  }
  return faults;
}
