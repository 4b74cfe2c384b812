import type { EventKind } from './event.js';

/**
 * What ISA-18.2 and IEC 62682 want written down of each alarm when it is rationalised: what brings it
 * about, what follows where nobody acts, what to do, and how long there is for it. Alerts have the
 * same, for those who look after the plant; the operator need not act for them.
 */
export interface AlarmText {
  readonly cause: string;
  readonly consequence: string;
  readonly action: string;
  /**
   * Time within which acting still helps [h]: of alarms an hour at most, of alerts days. Where an event
   * says until when (`act_by`), that counts.
   */
  readonly respond_within_h: number;
}

/** Of an outlet near its limit where no end is known: front width over front speed at rated power. */
const BEFORE_OUTLET_H = 0.5;
const AT_ONCE_H = 0.25;
const SHIFT_H = 8;
const DAY_H = 24;
const WEEK_H = 168;

export const ALARM_TEXTS: Readonly<Record<EventKind, AlarmText>> = {
  outlet_near_limit: {
    cause: 'The store runs out earlier than was told for this discharge, or unannounced.',
    consequence: 'The discharge ends at its limit; power that was sold is not delivered.',
    action: 'Lower the power or prepare the change-over, and tell who sells.',
    respond_within_h: BEFORE_OUTLET_H,
  },
  pressure_drop_near_limit: {
    cause: 'Flow is high, or dust, fines or frost close the bed.',
    consequence: 'Rock is lifted or the machine trips when the flow rises further.',
    action: 'Lower the power until the pressure drop falls; then look for dust or frost.',
    respond_within_h: AT_ONCE_H,
  },
  estimate_blind: {
    cause:
      'No readings arrive, or most of them contradict the estimate, while the unit discharges.',
    consequence: 'The end of the discharge comes unannounced; hours offered may not be there.',
    action:
      "Go by the control system's outlet temperatures; tell who sells; have readings restored.",
    respond_within_h: AT_ONCE_H,
  },
  data_stale: {
    cause: 'The gateway, the network or the broker is silent.',
    consequence: 'Fronts, energy and hours are predictions and grow less certain.',
    action: 'Look at the gateway and the broker.',
    respond_within_h: SHIFT_H,
  },
  front_spread: {
    cause: 'Heat transfer has fallen (dust, fines), or gas finds a channel.',
    consequence: 'Fewer hours than the stored heat suggests.',
    action: 'Compare heat-transfer factor and flow factors; plan an inspection of the bed.',
    respond_within_h: WEEK_H,
  },
  sensor_rejected: {
    cause: 'A thermocouple, its cable, card or cold junction is at fault.',
    consequence: 'The estimate goes on with a larger sigma there.',
    action: 'Check what the sentence names; mend it at the next stand.',
    respond_within_h: WEEK_H,
  },
  front_view_disagrees: {
    cause: 'Flow meter, sensors of a string or the bed are not as modelled.',
    consequence: 'Hours may lean to one side.',
    action: 'Look at the profile of the string, its sensors and the flow meter.',
    respond_within_h: WEEK_H,
  },
  gas_temperature_off: {
    cause: 'The gas thermometer, its transmitter or its range is wrong, or no gas flows there.',
    consequence: 'The error goes into the estimate as heat while gas flows.',
    action: 'Check sensor, transmitter and range.',
    respond_within_h: DAY_H,
  },
  database_unreachable: {
    cause: 'The database server or the network is away.',
    consequence: 'Nothing is lost; trends elsewhere stand still, and the local disk fills slowly.',
    action: 'Look at the server and the network.',
    respond_within_h: DAY_H,
  },
  disk_full: {
    cause: 'The disk of this machine is full, and thinning what rockhour keeps gives no more room.',
    consequence:
      'No reading is taken in: they wait at the broker, which loses them beyond what it may keep.',
    action: 'Make room on the disk, or have it made; rockhour goes on by itself.',
    respond_within_h: 1,
  },
  store_damaged: {
    cause: 'The disk, its controller or another program has damaged a file of the local store.',
    consequence:
      'It was set aside and a fresh one begun; what could not be read is missing from it.',
    action: 'Have the disk examined; keep the old file until its history is no longer wanted.',
    respond_within_h: DAY_H,
  },
  heat_transfer_low: {
    cause: 'Dust or fines cover the rock, or gas passes it in channels.',
    consequence: 'Fronts widen; usable energy shrinks cycle by cycle.',
    action: 'Plan an inspection of the bed; look at filters.',
    respond_within_h: WEEK_H,
  },
  string_flow_uneven: {
    cause: 'Gas finds a channel, or part of the bed is closed.',
    consequence: 'One part of the bed ends the discharge early for all.',
    action: 'Plan an inspection of the bed surface and the distributor.',
    respond_within_h: WEEK_H,
  },
  front_travel_off: {
    cause: 'The flow meter has drifted, or the rock holds more or less heat than thought.',
    consequence: 'Hours by the meter lean to one side until they are learned anew.',
    action: 'Check the flow meter against another measurement.',
    respond_within_h: WEEK_H,
  },
  standing_loss_high: {
    cause: 'Insulation is wet, damaged or has sagged.',
    consequence: 'Heat is lost while the unit stands; the mantle may get hot.',
    action: 'Measure the mantle with a thermal camera; look at the insulation.',
    respond_within_h: WEEK_H,
  },
  valve_leaks: {
    cause: 'A shut-off valve does not close.',
    consequence: 'The front moves and spreads while the unit stands.',
    action: 'Check the end positions of the valves; lap or replace the seat.',
    respond_within_h: DAY_H,
  },
  pressure_drop_high: {
    cause: 'Dust, fines or frost in the bed.',
    consequence: 'More power for the same flow, and the greatest flow shrinks.',
    action: 'Look at filters; where it is high only while cold, dry the gas.',
    respond_within_h: WEEK_H,
  },
  plateau_off: {
    cause: 'The machine, its coolers or a gas thermometer is not as before.',
    consequence: 'Charged rock is colder or warmer than counted on.',
    action: 'Check coolers and machine against their curves, and the gas thermometer.',
    respond_within_h: WEEK_H,
  },
  gas_lost: {
    cause: 'The loop leaks.',
    consequence: 'Pressure and power fall.',
    action: 'Search the leak; ventilate enclosed rooms before anybody enters them.',
    respond_within_h: DAY_H,
  },
  bed_settled: {
    cause: 'The rock has settled under its own weight and the thermal cycles.',
    consequence: 'Gas passes above the bed; the topmost thermocouples tell nothing of the rock.',
    action: 'Look at the level of the bed at the next opening; refill.',
    respond_within_h: WEEK_H,
  },
  stores_mismatched: {
    cause: 'The two stores have drifted apart over cycles.',
    consequence: 'What one holds more than the other can use is not delivered.',
    action: 'Look at the ways to trim; run one at the next cheap hours.',
    respond_within_h: WEEK_H,
  },
  energy_lost: {
    cause: 'Degradation as the indicators show it.',
    consequence: 'Less energy per cycle than rated.',
    action: 'Follow the most probable cause; weigh a repair against what is lost.',
    respond_within_h: WEEK_H,
  },
};
