import 'uplot/dist/uPlot.min.css';
import './style/base.css';
import './style/panels.css';
import './style/drawing.css';
import { Api } from './lib/api.js';
import { byId, setText } from './lib/dom.js';
import { zoneText } from './lib/format.js';
import { LiveConnection } from './lib/live.js';
import { PageModel } from './lib/model.js';
import { alarmsPanel } from './panels/alarms.js';
import { figuresPanel } from './panels/figures.js';
import { freshnessPanel } from './panels/freshness.js';
import { historyPanel } from './panels/history.js';
import { hoursPanel } from './panels/hours.js';
import { storesPanel } from './panels/stores.js';
import { unitsPanel } from './panels/units.js';

const ALARMS_EVERY_MS = 30_000;

const api = new Api();
const model = new PageModel();

/** The list of what stands is always asked of the server whole, never pieced together here. */
async function reloadAlarms(): Promise<void> {
  try {
    const { standing, suppressed } = await api.alarms();
    model.standing = standing;
    model.heldBack = suppressed;
    model.changed();
  } catch {
    // The stream says so if the server is away; the list of before stays, marked as old.
  }
}

async function loadDefinition(unit: string): Promise<void> {
  const entry = model.units.find((candidate) => candidate.unit === unit);
  if (entry === undefined || entry.definition !== null) return;
  entry.definition = (await api.unit(unit)).definition;
  model.changed();
}

async function loadUnits(): Promise<void> {
  model.takeUnits(await api.units());
  if (model.selected !== null) await loadDefinition(model.selected);
}

const live = new LiveConnection((profileOf, id) => api.streamUrl(profileOf, id), {
  hello: (hello) => {
    model.setConnection('live');
    // After a restart the configuration may be another one.
    if (hello.resume === 'gap') for (const entry of model.units) entry.definition = null;
    void loadUnits().catch(() => undefined);
    void reloadAlarms();
  },
  state: (state) => model.takeState(state),
  alarms: () => void reloadAlarms(),
  beat: (beat) => model.takeBeat(beat),
  lost: () => model.setConnection('lost'),
});

function select(unit: string): void {
  model.selected = unit;
  history.replaceState(null, '', `?unit=${encodeURIComponent(unit)}`);
  void loadDefinition(unit).catch(() => undefined);
  live.follow(unit);
  model.changed();
}

const freshness = freshnessPanel(model);
for (const update of [
  unitsPanel(model, select),
  freshness,
  figuresPanel(model),
  hoursPanel(model, api),
  storesPanel(model),
  alarmsPanel(model, api, reloadAlarms),
  historyPanel(model, api),
]) {
  model.onChange(update);
}
// The age grows by itself.
window.setInterval(() => model.changed(), 1_000);
window.setInterval(() => void reloadAlarms(), ALARMS_EVERY_MS);

/** Asks which units there are, until the server answers; then opens the stream. */
async function begin(): Promise<void> {
  try {
    await loadUnits();
  } catch {
    model.setConnection('lost');
    window.setTimeout(() => void begin(), 2_000);
    return;
  }
  const wanted = new URLSearchParams(location.search).get('unit');
  const unit = model.units.some((entry) => entry.unit === wanted) ? wanted : model.selected;
  setText(byId('about'), `rockhour ${model.version} · times in ${zoneText(new Date())}`);
  if (unit !== null) select(unit);
}

void begin();
