import { effect } from '@preact/signals';
import { Api } from './api.js';
import { LiveConnection } from './live.js';
import { loginWanted } from './login.js';
import { PageModel } from './model.js';
import { putUnitInAddress, unitOfAddress } from './route.js';

const ALARMS_EVERY_MS = 30_000;
const RETRY_MS = 2_000;

/** The one model, the one way to ask and the one stream that all sheets share. */
export const model = new PageModel();
export const api = new Api();

/** The list of what stands is always asked of the server whole, never pieced together here. */
export async function reloadAlarms(): Promise<void> {
  if (loginWanted.peek()) return;
  try {
    const { standing, suppressed, shelve_most_h } = await api.alarms();
    model.shelveMost_h.value = shelve_most_h;
    model.standing.value = standing;
    model.heldBack.value = suppressed;
    model.alarmNews.value += 1;
  } catch {
    // The stream says so if the server is away; the list of before stays, marked as old.
  }
}

/** Units whose definition may be another one by now: it is shown until the new one has come. */
const doubted = new Set<string>();

async function loadDefinition(unit: string): Promise<void> {
  const entry = model.units.value.find((candidate) => candidate.unit === unit);
  if (entry === undefined || (entry.definition !== null && !doubted.has(unit))) return;
  const { definition } = await api.unit(unit);
  doubted.delete(unit);
  // The same again is no news: what is drawn from it would be drawn anew.
  if (JSON.stringify(definition) !== JSON.stringify(entry.definition)) {
    model.takeDefinition(unit, definition);
  }
}

async function loadUnits(): Promise<void> {
  model.takeUnits(await api.units());
  const { value: unit } = model.selected;
  if (unit !== null) await loadDefinition(unit);
}

const live = new LiveConnection((profileOf, id) => api.streamUrl(profileOf, id), {
  hello: (hello) => {
    model.setConnection('live');
    // After a restart the configuration may be another one.
    if (hello.resume === 'gap') {
      for (const { unit } of model.units.value) doubted.add(unit);
    }
    void loadUnits().catch(() => undefined);
    void reloadAlarms();
  },
  state: (state) => model.takeState(state),
  alarms: (leftOut) => {
    if (leftOut > 0) model.takeStorm(leftOut);
    void reloadAlarms();
  },
  beat: (beat) => model.takeBeat(beat),
  lost: () => {
    model.setConnection('lost');
    // A stream does not tell why it ended: a question does, if the log-in was taken back.
    void reloadAlarms();
  },
});

// Without a log-in nothing is asked for; what was shown is gone with the sheets.
effect(() => {
  if (!loginWanted.value) return;
  live.stop();
  model.setConnection('lost');
});

/** Chooses the unit that all sheets show. */
export function select(unit: string): void {
  model.notHere.value = null;
  model.selected.value = unit;
  putUnitInAddress(unit);
  void loadDefinition(unit).catch(() => undefined);
  live.follow(unit);
}

/** Asks which units there are, until the server answers; then opens the stream. */
export async function begin(): Promise<void> {
  try {
    await loadUnits();
    loginWanted.value = false;
    await api.whoAmI();
  } catch {
    if (loginWanted.peek()) return;
    model.setConnection('lost');
    window.setTimeout(() => void begin(), RETRY_MS);
    return;
  }
  const wanted = unitOfAddress();
  const known = model.units.value.some((entry) => entry.unit === wanted);
  const unit = known ? wanted : model.selected.value;
  if (unit !== null) select(unit);
  model.notHere.value = known ? null : wanted;
}

/** Ends the log-in; the page asks for a token again. */
export async function logOut(): Promise<void> {
  await api.logOut().catch(() => undefined);
  loginWanted.value = true;
}

/** What happens by time alone: ages grow, lists of alarms are asked for again. */
export function startTimers(): void {
  window.setInterval(() => {
    model.tick_ms.value = performance.now();
  }, 1_000);
  window.setInterval(() => void reloadAlarms(), ALARMS_EVERY_MS);
}
