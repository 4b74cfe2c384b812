import { useRef, useState } from 'preact/hooks';
import { inOrder, isOpen } from '../../lib/alarmOrder.js';
import { clock } from '../../lib/format.js';
import { model } from '../../lib/page.js';
import { AlarmItem } from './AlarmItem.js';
import { commandFault, type HidingAction, nameless } from './commands.js';
import { EventsBelow } from './EventsBelow.js';
import { HeldBack } from './HeldBack.js';
import { HideDialog } from './HideDialog.js';
import { useFocusKept } from './useFocusKept.js';
import { WhoDialog } from './WhoDialog.js';
import { who } from './who.js';

/** A storm is spoken of for so long after its last event [ms]. */
const STORM_TOLD_MS = 600_000;

/** What stands, of all units: an alarm of a unit that is not on the screen must not be missed. */
export function Alarms() {
  const root = useRef<HTMLElement>(null);
  const list = useRef<HTMLUListElement>(null);
  const [hiding, setHiding] = useState<{ id: string; action: HidingAction } | null>(null);
  useFocusKept(root);
  const units = model.units.value;
  const nameOf = (unit: string) => units.find((one) => one.unit === unit)?.name ?? unit;
  const timeOf = (unit: string) =>
    units.find((one) => one.unit === unit)?.state?.estimate?.time ?? undefined;
  const events = inOrder(model.standing.value);
  const held = model.heldBack.value;
  const open = events.filter(isOpen).length;
  const hidden = hiding === null ? null : (events.find(({ id }) => id === hiding.id) ?? null);
  const named = nameless.value;
  const asked = named === null ? undefined : [...events, ...held].find(({ id }) => id === named.id);
  return (
    <section id="alarms" ref={root} aria-labelledby="alarms-head" tabIndex={-1}>
      <h2 id="alarms-head">Alarms and alerts</h2>
      <p class="when" role="status" data-field="alarm-count">
        {events.length === 0
          ? 'Nothing stands.'
          : `${events.length} standing, ${open} to acknowledge`}
      </p>
      <Storm />
      <ul
        ref={list}
        class="events"
        tabIndex={events.length > 0 ? 0 : undefined}
        aria-label="Standing"
      >
        {events.map((event) => (
          <AlarmItem
            key={event.id}
            event={event}
            unitName={nameOf(event.unit)}
            now={timeOf(event.unit)}
            onHide={(action) => setHiding({ id: event.id, action })}
          />
        ))}
      </ul>
      <EventsBelow list={list} />
      <HeldBack held={held} nameOf={nameOf} />
      <p class="fault" role="alert">
        {commandFault}
      </p>
      {(events.length > 0 || held.length > 0) && (
        <p class="who">
          <label for="who">Acknowledge as</label>{' '}
          <input
            id="who"
            autocomplete="name"
            maxLength={64}
            size={14}
            value={who}
            onInput={(typed) => {
              who.value = typed.currentTarget.value;
            }}
          />
        </p>
      )}
      {named !== null && asked !== undefined && (
        <WhoDialog
          key={`${named.action} ${named.id}`}
          action={named.action}
          event={asked}
          unitName={nameOf(asked.unit)}
        />
      )}
      {hiding !== null && hidden !== null && (
        <HideDialog
          key={`${hiding.action} ${hiding.id}`}
          event={hidden}
          action={hiding.action}
          unitName={nameOf(hidden.unit)}
          most_h={model.shelveMost_h.value}
          onClose={() => setHiding(null)}
        />
      )}
    </section>
  );
}

/** More at once than is sent one by one: the list holds them all, and this says so. */
function Storm() {
  const storm = model.storm.value;
  if (storm === null) return null;
  // The tick ends it.
  if (model.tick_ms.value < 0 || Date.now() - storm.last_ms > STORM_TOLD_MS) return null;
  return (
    <p class="storm" role="status">
      {`A storm: ${storm.count} changes until ${clock(storm.last_ms)} came faster than they could be told one by one. The list holds all that stands.`}
    </p>
  );
}
