import { ALARM_STATE_WORDS } from '../../lib/alarmOrder.js';
import { dateClock } from '../../lib/format.js';
import type { Standing } from '../../lib/wire.js';
import { type Action, command } from './commands.js';

/** One line on what is held back, by whom and until when. */
function heldWords({ state, shelved, out_of_service }: Standing): string {
  const words = ALARM_STATE_WORDS[state];
  if (shelved) {
    return `${words} by ${shelved.by} until ${dateClock(shelved.until)}: ${shelved.why}`;
  }
  if (out_of_service) return `${words} by ${out_of_service.by}: ${out_of_service.why}`;
  return words;
}

const BACK: Partial<Record<Standing['state'], { action: Action; label: string }>> = {
  shelved: { action: 'unshelve', label: 'Take from the shelf' },
  out_of_service: { action: 'return_to_service', label: 'Back into service' },
};

/** What is held back, apart from what stands; opened on asking. */
export function HeldBack({
  held,
  nameOf,
}: {
  held: readonly Standing[];
  nameOf(unit: string): string;
}) {
  if (held.length === 0) return null;
  return (
    <details class="held-back">
      <summary>{`${held.length} held back`}</summary>
      <ul>
        {held.map((event) => {
          const back = BACK[event.state];
          const name = `${event.kind.replaceAll('_', ' ')} · ${nameOf(event.unit)} · ${event.subject}`;
          return (
            <li key={event.id} data-id={event.id} data-state={event.state} tabIndex={-1}>
              <p>{`${name}: ${heldWords(event)}`}</p>
              {event.active && <p class="when">Its condition stands.</p>}
              {back !== undefined && (
                <button
                  type="button"
                  data-action={back.action}
                  aria-label={`${back.label}: ${name}`}
                  onClick={() => void command(back.action, event.id)}
                >
                  {back.label}
                </button>
              )}
            </li>
          );
        })}
      </ul>
    </details>
  );
}
