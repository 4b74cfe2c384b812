import type { Mode } from '../definitions.js';
import type { RejectedSensor, SensorVerdict } from '../estimate.js';
import type { GasDoubt } from '../track/gasDoubts.js';
import type { CauseView } from './causes.js';
import { CAUSES, PROBABLE } from './causeTable.js';
import { waitingFor } from './consequences.js';
import type { IndicatorView } from './indicator.js';
import type { DropFault } from './operatorAlarms.js';

/** Sentences for a tired person: what is the case, by how much, what it means, what to look at. */

/** Readings of one sensor. */
const VERDICT_WORDS: Readonly<Record<SensorVerdict, string>> = {
  open: 'gives no reading',
  burst: 'reads beyond anything the store can be',
  stuck: 'does not move although its surroundings do',
  drifting: 'drifts away from its neighbours',
  offset: 'reads off by a constant amount',
  reversed: 'reads mirrored, as with reversed polarity',
  swapped: 'reads what another one should',
  wrong_type: 'reads as by the table of another type',
  outlier: 'reads wildly now and then',
  group_fault: 'is off together with the others of its group',
  uncovered: 'seems to sit in gas, no longer in the bed',
};

const VERDICT_LOOK: Readonly<Record<SensorVerdict, string>> = {
  open: 'its cable, terminals and channel',
  burst: 'its cable, terminals and channel',
  stuck: 'the gateway and the channel that hold its value',
  drifting: 'the thermocouple itself at the next calibration',
  offset: 'its cold junction and extension cable',
  reversed: 'its two wires',
  swapped: 'its terminals and those of the other one',
  wrong_type: 'the type set for its channel, and its extension cable',
  outlier: 'loose terminals, shielding and earthing',
  group_fault: 'the card, cold junction or cable that the group shares',
  uncovered: 'the level of the bed at the top',
};

export function degC(kelvin: number): string {
  return `${(kelvin - 273.15).toFixed(1)} degC`;
}

export function duration(seconds: number): string {
  if (seconds < 300) return `${Math.round(seconds)} s`;
  if (seconds < 7200) return `${Math.round(seconds / 60)} min`;
  return `${(seconds / 3600).toFixed(1)} h`;
}

/** ISO 8601 UTC as a sentence tells it: `2026-01-31 06:00:30 UTC`. */
export function toldTime(iso: string): string {
  return `${iso.slice(0, 19).replace('T', ' ')} UTC`;
}

export function sensorRaised(store: string, sensor: RejectedSensor): string {
  const since = toldTime(sensor.since);
  const what =
    sensor.verdict === 'group_fault'
      ? `What the readings of the group have in common is not believed since ${since}; their ` +
        'differences are used on.'
      : `Its readings are left out since ${since}; the estimate goes on with a larger sigma there.`;
  return (
    `Thermocouple ${sensor.id} in store ${store} ${VERDICT_WORDS[sensor.verdict]} ` +
    `(${sensor.verdict}${sensor.evidence === '' ? '' : `: ${sensor.evidence}`}). ${what} Look at ` +
    `${VERDICT_LOOK[sensor.verdict]}.`
  );
}

export function sensorReturned(store: string, sensor: string): string {
  return `Thermocouple ${sensor} in store ${store} is used again.`;
}

export function sensorInGas(store: string, sensor: string): string {
  return (
    `Thermocouple ${sensor} in store ${store} is still left out, as it hangs in gas over the settled bed: the ` +
    'alert of the bed stands for it.'
  );
}

export function manySensorsRaised(store: string, count: number, all: number): string {
  return (
    `Store ${store}: ${count} of ${all} thermocouples are left out at once. So many point to one cause: ` +
    'a card, cable or cold junction they share, or a bed that no longer behaves as modelled. Look at ' +
    'their groups, at the heat-transfer factor and at the front views; trust the energy less meanwhile.'
  );
}

export function manySensorsReturned(store: string, count: number, all: number): string {
  return `Store ${store}: ${count} of ${all} thermocouples are left out, no longer many.`;
}

export function staleRaised(unit: string, age_s: number, limit_s: number): string {
  return (
    `Unit ${unit}: no reading for ${duration(age_s)} (limit ${duration(limit_s)}). Fronts, energy and ` +
    'hours are predictions now and grow less certain. Look at the gateway and the broker, and go by ' +
    "the control system's own readings meanwhile."
  );
}

export function staleReturned(unit: string): string {
  return `Unit ${unit}: readings arrive again.`;
}

export function dropRaised(store: string, drop_Pa: number, most_Pa: number): string {
  const share = Math.round((100 * drop_Pa) / most_Pa);
  return (
    `Store ${store}: its pressure drop is ${(drop_Pa / 1e3).toFixed(2)} kPa, ${share} % of the greatest ` +
    `allowed ${(most_Pa / 1e3).toFixed(2)} kPa. More flow would lift rock or trip the machine. Lower the ` +
    'power, and look for dust or frost in the bed.'
  );
}

/** @param why it stands; its drop is away from the limit; no reading tells any more */
export function dropReturned(store: string, why: 'stands' | 'away' | 'lost'): string {
  const words = {
    stands: 'the unit stands, without flow and pressure drop.',
    away: 'its pressure drop is away from its limit again.',
    lost:
      'its pressure drop can no longer be judged, without a reading that can be for ten minutes; it may ' +
      'still be near its limit. Go by the flow and the machine, and look at the transmitter.',
  };
  return `Store ${store}: ${words[why]}`;
}

export function dropSensorRaised(channel: string, store: string, fault: DropFault): string {
  const what = {
    silent: 'gives no reading that can be',
    negative: 'reads below zero while gas flows',
    beyond: 'reads several times what may ever be over the bed',
  }[fault];
  return (
    `Pressure drop ${channel} of store ${store} ${what}: it is not used, and no alarm of it can be told. ` +
    'Look at its transmitter, the range, the impulse lines and which of them is which.'
  );
}

export function dropSensorReturned(channel: string): string {
  return `Pressure drop ${channel} is used again.`;
}

export function blindRaised(unit: string, quality: string): string {
  return (
    `Unit ${unit} discharges, but its estimate is ${quality}: hours and state of charge are no guide ` +
    'now. Go by the outlet temperatures of the control system, and take what has been sold for unsure. ' +
    'Look at the gateway and the thermocouples.'
  );
}

export function blindReturned(unit: string, mode: Mode): string {
  if (mode === 'discharge') return `Unit ${unit}: its estimate is a guide again.`;
  return `Unit ${unit}: the discharge has ended; it ${mode === 'charge' ? 'charges' : 'stands'}.`;
}

export function gasRaised({ channel, store, end, off_K, rock_K }: GasDoubt): string {
  const [inlet, way] =
    end === 'charge_inlet' ? ['charge', 'charging'] : ['discharge', 'discharging'];
  return (
    `Gas temperature ${channel} at the ${inlet} inlet of store ${store} reads ` +
    `${Math.abs(off_K).toFixed(0)} K ${off_K > 0 ? 'more' : 'less'} than the rock behind it, at ` +
    `${degC(rock_K)} by thermocouples that agree, through which its gas has long flowed. Whatever it ` +
    `is off by goes into the estimate as heat while ${way}. Look at this sensor, its transmitter and ` +
    'its range, and at whether gas flows as metered.'
  );
}

export function gasReturned({ channel, store }: GasDoubt): string {
  return `Gas temperature ${channel} of store ${store} agrees with the rock behind it again, or it is looked at anew.`;
}

export function databaseRaised(service: string, down_s: number, detail: string): string {
  return (
    `${service} has not been reachable for ${duration(down_s)}${detail === '' ? '' : ` (${detail})`}. ` +
    'Nothing is lost: readings and estimates are kept on this machine and sent on once it answers. ' +
    'Look at the server and the network.'
  );
}

export function databaseReturned(service: string): string {
  return `${service} answers again; what was kept is being sent on.`;
}

/** With the most probable explanation that speaks of its store or of the unit, where there is one. */
export function indicatorRaised(view: IndicatorView, causes: readonly CauseView[]): string {
  const store = view.subject.split('/')[0];
  const cause = causes.find((one) => one.subject === store || CAUSES[one.cause].of === 'unit');
  if (cause === undefined) return view.sentence;
  const sure = `${Math.round(100 * cause.probability)} %`;
  const waiting = waitingFor(view, causes).map((kind) => kind.replaceAll('_', ' '));
  const follows =
    waiting.length === 0
      ? ''
      : ` What follows from it has no alert of its own while this one stands: ${waiting.join(', ')}.`;
  const likely =
    cause.probability >= PROBABLE ? 'Probably' : 'No cause is probable by itself; likeliest';
  return `${view.sentence} ${likely} ${CAUSES[cause.cause].words} (${sure}). On site: ${cause.check}.${follows}`;
}

export function indicatorWithdrawn(view: IndicatorView): string {
  return (
    `Withdrawn: it is off by what the travel of the fronts says of the flow meter, whose alert stands. ` +
    view.sentence
  );
}

export function indicatorReturned(view: IndicatorView): string {
  return `As healthy again: ${view.sentence}`;
}
