import { signal } from '@preact/signals';
import { wordsOf } from '../../lib/api.js';
import { ownName } from '../../lib/login.js';
import { api, reloadAlarms } from '../../lib/page.js';
import { rememberWho, who } from './who.js';

export type Action = 'acknowledge' | 'reset' | 'unshelve' | 'return_to_service';
export type HidingAction = 'shelve' | 'out_of_service';

/** What was wrong with the last command, in words. */
export const commandFault = signal('');

const NOT_DONE: Readonly<Record<Action | HidingAction, string>> = {
  acknowledge: 'Not acknowledged.',
  reset: 'Not reset.',
  unshelve: 'Not taken from the shelf.',
  return_to_service: 'Not taken back into service.',
  shelve: 'Not shelved.',
  out_of_service: 'Not taken out of service.',
};

const pathOf = (action: Action | HidingAction) => `api/alarms/${action.replaceAll('_', '-')}`;

/** @returns what was wrong, in words; null where it is done */
export async function send(
  action: Action | HidingAction,
  body: { id: string; why?: string; hours?: number },
): Promise<string | null> {
  let fault: string | null = null;
  try {
    // With a log-in its name is recorded, with or without another.
    const said = who.value.trim();
    await api.post(pathOf(action), { ...body, ...(said === '' ? {} : { who: said }) });
    rememberWho();
  } catch (error) {
    fault = `${NOT_DONE[action]} ${wordsOf(error)}`;
  }
  await reloadAlarms();
  return fault;
}

/** A command that waits for the name of whoever gives it; null: none does. */
export const nameless = signal<{ readonly action: Action; readonly id: string } | null>(null);

/** A command that needs a name only; without one it is asked for where the command was given. */
export async function command(action: Action, id: string): Promise<void> {
  if (who.value.trim() === '' && ownName() === null) {
    nameless.value = { action, id };
    return;
  }
  commandFault.value = (await send(action, { id })) ?? '';
}
