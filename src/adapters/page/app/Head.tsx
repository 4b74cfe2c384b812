import { isOpen, openWords } from '../lib/alarmOrder.js';
import { ageText, QUALITY_WORDS } from '../lib/format.js';
import { ageNow } from '../lib/model.js';
import { model, select } from '../lib/page.js';
import { hrefOf, route, SHEETS, type Sheet } from '../lib/route.js';
import { TRUST_WORDS, trustOf } from '../lib/trust.js';

const SHEET_WORDS: Readonly<Record<Sheet, string>> = {
  now: 'Now',
  rock: 'Rock',
  offer: 'Offer',
  site: 'All units',
};

/** Name of the site, the sheets, the units, what is open and how old the data are: on every sheet. */
export function Head() {
  return (
    <header class="top">
      <p class="brand">
        <strong>rockhour</strong> <span id="site">{model.site}</span>
      </p>
      <SheetLinks />
      <UnitButtons />
      <OpenCount />
      <Freshness />
    </header>
  );
}

function SheetLinks() {
  const shown = model.units.value.length > 1 ? SHEETS : SHEETS.filter((name) => name !== 'site');
  return (
    <nav id="sheets" aria-label="Sheets">
      {shown.map((name) => (
        <a
          key={name}
          href={hrefOf(name)}
          aria-current={route.value.sheet === name ? 'page' : undefined}
        >
          {SHEET_WORDS[name]}
        </a>
      ))}
    </nav>
  );
}

/** One button per unit, with what is open there and whether its data are stale. */
function UnitButtons() {
  return (
    <nav id="units" aria-label="Units">
      {model.units.value.map((entry) => {
        const own = model.standing.value.filter((event) => event.unit === entry.unit);
        const open = own.filter(isOpen).length;
        const notes = [open > 0 && `${open} open`, entry.stale && 'stale'].filter(Boolean);
        return (
          <button
            key={entry.unit}
            type="button"
            data-unit={entry.unit}
            aria-pressed={entry.unit === model.selected.value}
            onClick={() => select(entry.unit)}
          >
            {entry.name}
            {notes.length > 0 && <span class="note">{notes.join(', ')}</span>}
          </button>
        );
      })}
    </nav>
  );
}

/** How much waits to be acknowledged, of all units, whatever is scrolled to. */
function OpenCount() {
  const { words, alarms } = openWords(model.standing.value);
  if (words === '') return null;
  return (
    <a id="open-count" href={hrefOf('now', 'alarms')} data-alarms={alarms > 0 ? '' : undefined}>
      {`${alarms > 0 ? '▲' : '■'} ${words} to acknowledge`}
    </a>
  );
}

/** Age of the data, always in the same place. */
function Freshness() {
  const entry = model.unit.value;
  const trust = trustOf(model.connection.value, entry);
  const age_s = entry === null ? null : ageNow(entry, model.tick_ms.value);
  const quality = entry?.state?.estimate?.quality;
  return (
    <div
      id="freshness"
      data-trust={trust}
      title={quality === undefined ? undefined : `Estimate ${QUALITY_WORDS[quality]}`}
    >
      <span class="sign" aria-hidden="true" />
      <p>
        <strong data-field="trust">{TRUST_WORDS[trust]}</strong>
        {' · '}
        <span class="what">newest reading </span>
        <span data-field="age">{age_s === null ? 'not there yet' : `${ageText(age_s)} old`}</span>
      </p>
    </div>
  );
}
