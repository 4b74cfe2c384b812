import { useState } from 'preact/hooks';

export { csvOf, tabsOf } from '../lib/cells.js';

/** Gives a text to the browser as a file. */
export function saveText(name: string, text: string, type = 'text/csv;charset=utf-8'): void {
  const url = URL.createObjectURL(new Blob([text], { type }));
  const link = document.createElement('a');
  link.href = url;
  link.download = name;
  link.click();
  // Not at once: the browser has to have begun to read it.
  window.setTimeout(() => URL.revokeObjectURL(url), 10_000);
}

/** Copies a text; without the right to (plain HTTP) through a field that is selected. */
async function copy(text: string): Promise<boolean> {
  try {
    await navigator.clipboard.writeText(text);
    return true;
  } catch {
    const field = document.createElement('textarea');
    field.value = text;
    field.className = 'copied-from';
    document.body.append(field);
    field.select();
    const done = document.execCommand('copy');
    field.remove();
    return done;
  }
}

/** What can be taken away of an answer: as a file and as text. */
export function Take({
  name,
  csv,
  text,
}: {
  name: string;
  /** The file: what is shown, or what the server writes of it. */
  csv(): string | Promise<string>;
  text(): string;
}) {
  const [said, say] = useState('');
  const save = async () => {
    try {
      saveText(name, await csv());
      say('');
    } catch (error) {
      say(error instanceof Error ? error.message : String(error));
    }
  };
  return (
    <p class="take">
      <button type="button" onClick={() => void save()}>
        Save as CSV
      </button>
      <button
        type="button"
        onClick={() =>
          void copy(text()).then((done) => say(done ? 'Copied.' : 'The browser does not let copy.'))
        }
      >
        Copy as text
      </button>
      <span role="status">{said}</span>
    </p>
  );
}
