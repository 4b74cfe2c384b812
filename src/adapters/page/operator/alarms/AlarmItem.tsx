import { ALARM_STATE_WORDS, isOpen } from '../../lib/alarmOrder.js';
import { dateClock, hoursText, parted } from '../../lib/format.js';
import { actWords } from '../../lib/verdict.js';
import type { Standing } from '../../lib/wire.js';
import { command, type HidingAction } from './commands.js';

/** Alarms are pointed, alerts are square; filled until acknowledged. */
function Sign({ event }: { event: Standing }) {
  const alarm = event.class === 'alarm';
  return (
    <svg class="event-sign" width="22" height="20" aria-hidden="true">
      <path d={alarm ? 'M11,2 L20,18 H2 Z' : 'M3,3 H19 V17 H3 Z'} />
      <text x="11" y="15.5" text-anchor="middle">
        {alarm ? '!' : 'i'}
      </text>
    </svg>
  );
}

/** @param now time of the newest estimate of its unit */
export function AlarmItem({
  event,
  unitName,
  now,
  onHide,
}: {
  event: Standing;
  unitName: string;
  now: string | undefined;
  onHide(action: HidingAction): void;
}) {
  const open = isOpen(event);
  const state = event.acknowledged_by
    ? `${ALARM_STATE_WORDS[event.state]} by ${event.acknowledged_by}`
    : ALARM_STATE_WORDS[event.state];
  // A long message would push its own buttons out of the list's room: what follows stands below them.
  const [first, rest] = parted(event.message);
  const act = event.active ? actWords(event, now) : null;
  const resettable = event.state === 'latched_acknowledged' && !event.active;
  const named = `${event.kind.replaceAll('_', ' ')} ${event.subject} ${unitName}`;
  return (
    <li
      tabIndex={-1}
      data-id={event.id}
      data-state={open ? event.state : 'acknowledged'}
      data-class={event.class}
      data-priority={event.priority}
    >
      <Sign event={event} />
      <div>
        <p class="head">
          <strong>{`${event.class}, ${event.priority}`}</strong>
          {` · ${unitName} · ${event.subject}`}
        </p>
        <p class="message">{first}</p>
        {act !== null && <p class="act-by">{act}</p>}
        <p class="when">{`${dateClock(event.time)} · ${state}`}</p>
        <details class="why">
          <summary data-action="ask">
            {rest === '' ? 'What to do' : 'What was seen, what to do'}
          </summary>
          <dl>
            {rest !== '' && <dt>Seen</dt>}
            {rest !== '' && <dd>{rest}</dd>}
            <dt>Do</dt>
            <dd>{event.action}</dd>
            <dt>Cause</dt>
            <dd>{event.cause}</dd>
            <dt>Else</dt>
            <dd>{event.consequence}</dd>
            <dt>Within</dt>
            <dd>{hoursText(event.respond_within_h)}</dd>
          </dl>
        </details>
        <p class="buttons">
          {open && (
            <button
              type="button"
              data-action="acknowledge"
              aria-label={`Acknowledge ${named}`}
              onClick={() => void command('acknowledge', event.id)}
            >
              Acknowledge
            </button>
          )}
          {resettable && (
            <button
              type="button"
              data-action="reset"
              aria-label={`Reset ${named}`}
              onClick={() => void command('reset', event.id)}
            >
              Reset
            </button>
          )}
          <button
            type="button"
            data-action="shelve"
            aria-label={`Shelve ${named}`}
            onClick={() => onHide('shelve')}
          >
            Shelve…
          </button>
          <button
            type="button"
            data-action="out_of_service"
            aria-label={`Out of service: ${named}`}
            onClick={() => onHide('out_of_service')}
          >
            Out of service…
          </button>
        </p>
      </div>
    </li>
  );
}
