import { isOpen, openWords } from '../lib/alarmOrder.js';
import { ageText, QUALITY_WORDS } from '../lib/format.js';
import { ageNow, type UnitEntry } from '../lib/model.js';
import { model, select } from '../lib/page.js';
import { hrefOf, route, SHEETS, type Sheet } from '../lib/route.js';
import { TRUST_WORDS, trustOf } from '../lib/trust.js';
import { viewport } from '../parts/viewport.js';

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
      <Units />
      <div class="watchline">
        <OpenCount />
        <Freshness />
      </div>
    </header>
  );
}

function SheetLinks() {
  const many = model.units.value.length + model.leftOut.value.length > 1;
  const shown = many ? SHEETS : SHEETS.filter((name) => name !== 'site');
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

/** So many units at the most have a button each, on a narrow screen fewer. */
const BUTTONS_MOST = 6;
const NARROW_MOST = 3;
const NARROW_PX = 760;
/** What else stands in the head, and what a button has around its letters, in sizes of type. */
const HEAD_REM = 50;
const BUTTON_REM = 6;
const LETTER_REM = 0.55;

/** Whether the units have room for a button each, so that the head stays in one row. */
function haveButtons(units: readonly UnitEntry[], site: string): boolean {
  const { width, rem } = viewport.value;
  if (width < NARROW_PX) return units.length <= NARROW_MOST;
  const letters = units.reduce(
    (sum, entry) => sum + entry.name.length + notesOf(entry).length,
    site.length,
  );
  const needed_rem = HEAD_REM + BUTTON_REM * units.length + LETTER_REM * letters;
  return units.length <= BUTTONS_MOST && needed_rem * rem <= width;
}

/** `2 open, stale` of a unit; '' where there is nothing to say. */
function notesOf(entry: UnitEntry): string {
  const own = model.standing.value.filter((event) => event.unit === entry.unit);
  const open = own.filter(isOpen).length;
  return [open > 0 && `${open} open`, entry.stale && 'stale'].filter(Boolean).join(', ');
}

/** The units, each with what is open there and whether its data are stale. */
function Units() {
  const units = model.units.value;
  if (haveButtons(units, model.site.value)) return <UnitButtons />;
  return (
    <nav id="units" aria-label="Units">
      <select
        aria-label="Unit"
        value={model.selected.value ?? ''}
        onChange={(event) => select(event.currentTarget.value)}
      >
        {units.map((entry) => {
          const notes = notesOf(entry);
          return (
            <option key={entry.unit} value={entry.unit}>
              {notes === '' ? entry.name : `${entry.name} (${notes})`}
            </option>
          );
        })}
      </select>
    </nav>
  );
}

function UnitButtons() {
  return (
    <nav id="units" aria-label="Units">
      {model.units.value.map((entry) => {
        const notes = notesOf(entry);
        return (
          <button
            key={entry.unit}
            type="button"
            data-unit={entry.unit}
            aria-pressed={entry.unit === model.selected.value}
            onClick={() => select(entry.unit)}
          >
            {entry.name}
            {notes !== '' && <span class="note">{notes}</span>}
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
    <a
      id="open-count"
      href={hrefOf('now', 'alarms')}
      data-alarms={alarms > 0 ? '' : undefined}
      aria-label={`${words} to acknowledge`}
    >
      {`${alarms > 0 ? '▲' : '■'} ${words}`}
      <span class="what"> to acknowledge</span>
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
        {age_s !== null && <span class="what">newest reading </span>}
        <span data-field="age">{age_s === null ? 'no reading yet' : `${ageText(age_s)} old`}</span>
      </p>
    </div>
  );
}
