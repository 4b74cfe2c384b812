import { useEffect, useRef, useState } from 'preact/hooks';
import type { Standing } from '../../lib/wire.js';
import { type Action, command, nameless } from './commands.js';
import { who } from './who.js';

const DOES: Readonly<Record<Action, string>> = {
  acknowledge: 'Acknowledge',
  reset: 'Reset',
  unshelve: 'Take from the shelf',
  return_to_service: 'Back into service',
};

/** Asks, once for this browser, for the name that is recorded with a command; then gives the command. */
export function WhoDialog({
  action,
  event,
  unitName,
}: {
  action: Action;
  event: Standing;
  unitName: string;
}) {
  const dialog = useRef<HTMLDialogElement>(null);
  const [fault, setFault] = useState('');
  useEffect(() => dialog.current?.showModal(), []);

  async function submit(submitted: Event): Promise<void> {
    submitted.preventDefault();
    const name = String(
      new FormData(submitted.currentTarget as HTMLFormElement).get('name'),
    ).trim();
    if (name === '') {
      setFault('Say who: a name is recorded with it.');
      document.getElementById('name-who')?.focus();
      return;
    }
    who.value = name;
    await command(action, event.id);
    dialog.current?.close();
  }

  return (
    <dialog
      ref={dialog}
      class="hide"
      aria-labelledby="name-head"
      onClose={() => {
        nameless.value = null;
      }}
    >
      <form onSubmit={(submitted) => void submit(submitted)} noValidate>
        <h2 id="name-head">{`${DOES[action]}: who does so?`}</h2>
        <p>
          <strong>{`${event.kind.replaceAll('_', ' ')} · ${unitName} · ${event.subject}`}</strong>
        </p>
        <label for="name-who">Your name; this browser remembers it</label>
        <input id="name-who" name="name" autocomplete="name" maxLength={64} />
        <p class="fault" role="alert">
          {fault}
        </p>
        <p class="buttons">
          <button type="submit">{DOES[action]}</button>
          <button type="button" onClick={() => dialog.current?.close()}>
            Not now
          </button>
        </p>
      </form>
    </dialog>
  );
}
