import { useEffect, useRef, useState } from 'preact/hooks';
import { wordsOf } from '../lib/api.js';
import { api, begin } from '../lib/page.js';

/** Asks for the token; what the page showed before is not to be seen meanwhile. */
export function LogIn() {
  const field = useRef<HTMLInputElement>(null);
  const [fault, setFault] = useState('');
  const [sending, setSending] = useState(false);
  useEffect(() => {
    document.title = 'Log in · rockhour';
    field.current?.focus();
  }, []);

  async function submit(submitted: Event): Promise<void> {
    submitted.preventDefault();
    const token = field.current?.value.trim() ?? '';
    if (token === '') {
      setFault('Paste the token first.');
      field.current?.focus();
      return;
    }
    setSending(true);
    try {
      await api.logIn(token);
      await begin();
    } catch (error) {
      setFault(wordsOf(error));
      setSending(false);
      field.current?.focus();
    }
  }

  return (
    <main id="login" tabIndex={-1}>
      <form onSubmit={(submitted) => void submit(submitted)} noValidate>
        <h1>rockhour: log in</h1>
        <p>
          This rockhour shows its figures to those who have a token. It comes from whoever looks
          after the plant’s configuration.
        </p>
        {/* What keeps passwords for people files them by a name. */}
        <input type="text" autocomplete="username" value="rockhour" hidden readOnly />
        <label for="login-token">Token</label>
        <input
          id="login-token"
          ref={field}
          type="password"
          name="token"
          autocomplete="current-password"
          spellcheck={false}
          aria-describedby="login-fault"
        />
        <p id="login-fault" class="fault" role="alert">
          {fault}
        </p>
        <p class="buttons">
          <button type="submit" disabled={sending}>
            Log in
          </button>
        </p>
      </form>
    </main>
  );
}
