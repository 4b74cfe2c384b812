import { useEffect, useRef } from 'preact/hooks';
import { zoneText } from '../lib/format.js';
import { login, loginWanted } from '../lib/login.js';
import { logOut, model } from '../lib/page.js';
import { route, type Sheet } from '../lib/route.js';
import { bannerText, isOld, TRUST_WORDS, trustOf } from '../lib/trust.js';
import { MaintenanceSheet } from '../maintenance/MaintenanceSheet.js';
import { OperatorSheet } from '../operator/OperatorSheet.js';
import { SiteSheet } from '../site/SiteSheet.js';
import { TraderSheet } from '../trader/TraderSheet.js';
import { zoneWords } from '../trader/times.js';
import { zoneOf } from '../trader/wire.js';
import { Head } from './Head.js';
import { LogIn } from './LogIn.js';

const SHEET_OF: Readonly<Record<Sheet, () => preact.JSX.Element>> = {
  now: OperatorSheet,
  rock: MaintenanceSheet,
  offer: TraderSheet,
  site: SiteSheet,
};

/** The log-in where one is loginWanted, else the page. */
export function App() {
  return loginWanted.value ? <LogIn /> : <Page />;
}

/** What lies higher than this may be under the head [px]. */
const HEAD_PX = 80;

/** The page: head and foot are the same on every sheet, so that old data never pass unnoticed. */
function Page() {
  const { sheet, part } = route.value;
  const main = useRef<HTMLElement>(null);
  const first = useRef(true);
  const entry = model.unit.value;
  const trust = trustOf(model.connection.value, entry);
  const old = isOld(trust);

  // A sheet that was changed to is read from its head, a part that was meant from there: from the row of
  // parts where there is one, which must not come to lie under the head.
  useEffect(() => {
    const meant = part === '' ? null : document.getElementById(part.split('/')[0] ?? '');
    if (meant !== null) {
      const parts = main.current?.querySelector('nav') ?? null;
      if (parts === null) meant.scrollIntoView();
      else if (parts.getBoundingClientRect().top < HEAD_PX) parts.scrollIntoView();
      meant.focus({ preventScroll: true });
    } else if (!first.current) {
      window.scrollTo(0, 0);
      main.current?.focus({ preventScroll: true });
    }
    first.current = false;
  }, [sheet, part]);

  const open = model.standing.value.filter((event) => event.state === 'unacknowledged').length;
  const title = `${open > 0 ? `(${open}) ` : ''}${old ? `${TRUST_WORDS[trust]} · ` : ''}${entry?.name ?? model.site.value} · rockhour`;
  useEffect(() => {
    document.title = title;
  }, [title]);

  const Shown = SHEET_OF[sheet];
  return (
    <>
      <button type="button" class="skip" onClick={() => main.current?.focus()}>
        Skip to the figures
      </button>
      <Head />
      <div id="banner" role="alert" data-trust={trust}>
        {bannerText(trust, entry, model.lostSince_ms.value)}
      </div>
      <NotHere />
      <main id="main" ref={main} tabIndex={-1} data-sheet={sheet} data-old={old ? '' : undefined}>
        <Shown />
      </main>
      <Foot />
    </>
  );
}

/** The address asked for a unit that is not run here: another one is shown, and that is said. */
function NotHere() {
  const wanted = model.notHere.value;
  const shown = model.unit.value;
  if (wanted === null || shown === null) return null;
  const leftOut = model.leftOut.value.some(({ unit }) => unit === wanted);
  return (
    <p id="not-here" role="status">
      {leftOut
        ? `The unit “${wanted}” is not run, as its configuration has faults; All units names them. `
        : `There is no unit “${wanted}” here. `}
      {`This is ${shown.name}.`}
    </p>
  );
}

function Foot() {
  return (
    <footer>
      <p>
        <strong>rockhour advises and trips nothing.</strong> It writes nothing to the control
        system. Hazards of pressure, heat, cold and oxygen deficiency are matters for the plant’s
        protection systems, local codes and licensed people.
      </p>
      <LoggedIn />
      <p id="about">{`rockhour ${model.version.value} · times in ${timesIn()}`}</p>
    </footer>
  );
}

/** Blocks are sold in the times of the connection, and so are those of the Offer sheet. */
const timesIn = (): string =>
  route.value.sheet === 'offer' ? zoneWords(zoneOf(model.unit.value)) : zoneText(new Date());

/** Whose log-in this is, and its end; nothing where rockhour asks for no tokens. */
function LoggedIn() {
  const { name = null, role = null } = login.value ?? {};
  if (name === null) return null;
  return (
    <p id="who-am-i">
      {`Logged in as ${name}, who may ${role === 'view' ? 'look' : role}`}
      <button type="button" onClick={() => void logOut()}>
        Log out
      </button>
    </p>
  );
}
