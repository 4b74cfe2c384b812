/** What goes wrong with the measurement; times in seconds of the simulation, `until_s` open-ended if absent. */
export type SensorFault = { readonly at_s: number; readonly until_s?: number } & (
  | { readonly kind: 'open' | 'stuck' | 'reversed'; readonly channel: string }
  | { readonly kind: 'burst'; readonly channel: string; readonly value_K: number }
  | { readonly kind: 'drift'; readonly channel: string; readonly rate_K_h: number }
  | { readonly kind: 'offset'; readonly channel: string; readonly offset_K: number }
  | { readonly kind: 'swapped'; readonly channel: string; readonly other: string }
  | { readonly kind: 'group_offset'; readonly group: string; readonly offset_K: number }
  | { readonly kind: 'group_open'; readonly group: string }
  /** The meter's reading is multiplied. */
  | { readonly kind: 'meter_step'; readonly factor: number }
  /** Nothing arrives at all. */
  | { readonly kind: 'gap' }
);

/** What changes in the plant itself: in one store, or around it. */
export type PlantChange = StoreChange | WeatherChange;

/** The weather turns: ambient temperature moves by `offset_K` over `ramp_s`. */
export interface WeatherChange {
  readonly kind: 'weather';
  readonly at_s: number;
  readonly offset_K: number;
  readonly ramp_s: number;
}

export type StoreChange = { readonly at_s: number; readonly store: string } & (
  | /** Heat-transfer factor goes from what it is to `factor` times its drawn value over `ramp_s`. */ {
      readonly kind: 'heat_transfer';
      readonly factor: number;
      readonly ramp_s?: number;
    }
  /** Flow of the tube that `string` stands for is multiplied, the others lose what it gains. */
  | { readonly kind: 'channelling'; readonly string: string; readonly factor: number }
  /**
   * While the unit stands, a valve lets `share` of the rated flow through the bed, positive as while
   * charging. No meter sees it.
   */
  | { readonly kind: 'leak'; readonly share: number }
  /**
   * The rock has sunk away from the thermocouples within `depth_m` of the bed's top: they hang in the
   * gas of that end. The rock that is there, and its heat, stay as they were.
   */
  | { readonly kind: 'settled'; readonly depth_m: number }
  /** Losses of mantle and ends are multiplied: the insulation is wet or has slipped. */
  | { readonly kind: 'insulation'; readonly factor: number }
  /**
   * The bed's pressure drop is multiplied: by dust; with `below_K` only while the coldest rock is
   * colder, by frost that melts again.
   */
  | { readonly kind: 'pressure_drop'; readonly factor: number; readonly below_K?: number }
  /** A share of the gas has left: pressure and density of the store are lower by it. */
  | { readonly kind: 'gas_loss'; readonly share: number; readonly ramp_s?: number }
);

function active(fault: SensorFault, time_s: number): boolean {
  return time_s >= fault.at_s && (fault.until_s === undefined || time_s < fault.until_s);
}

/**
 * Applies the faults to one scan of readings in SI units, in place.
 * @param stuck remembers where a stuck sensor stopped; one per simulation
 * @param groupOf group of each thermocouple
 */
export function applyFaults(
  values: Record<string, number>,
  faults: readonly SensorFault[],
  time_s: number,
  stuck: Map<string, number>,
  groupOf: ReadonlyMap<string, string | null>,
  flowChannels: readonly string[],
): void {
  const sound = { ...values };
  for (const fault of faults) {
    if (!active(fault, time_s)) {
      if (fault.kind === 'stuck') stuck.delete(fault.channel);
      continue;
    }
    const add = (id: string, by: number) => {
      values[id] = values[id]! + by;
    };
    switch (fault.kind) {
      case 'open':
        values[fault.channel] = Number.NaN;
        break;
      case 'burst':
        values[fault.channel] = fault.value_K;
        break;
      case 'reversed':
        // The voltage changes sign about the cold junction, taken at 25 degC.
        values[fault.channel] = 2 * 298.15 - values[fault.channel]!;
        break;
      case 'stuck': {
        const held = stuck.get(fault.channel) ?? values[fault.channel]!;
        stuck.set(fault.channel, held);
        values[fault.channel] = held;
        break;
      }
      case 'drift':
        add(fault.channel, (fault.rate_K_h * (time_s - fault.at_s)) / 3600);
        break;
      case 'offset':
        add(fault.channel, fault.offset_K);
        break;
      case 'swapped':
        values[fault.channel] = sound[fault.other]!;
        values[fault.other] = sound[fault.channel]!;
        break;
      case 'group_offset':
      case 'group_open':
        for (const [id, group] of groupOf) {
          if (group !== fault.group) continue;
          if (fault.kind === 'group_open') values[id] = Number.NaN;
          else add(id, fault.offset_K);
        }
        break;
      case 'meter_step':
        for (const id of flowChannels) values[id] = values[id]! * fault.factor;
        break;
      case 'gap':
        for (const id of Object.keys(values)) values[id] = Number.NaN;
        break;
    }
  }
}
