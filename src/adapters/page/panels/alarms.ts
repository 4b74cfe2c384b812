import { AnswerError, type Api } from '../lib/api.js';
import { byId, h, s, setAttributes, setText } from '../lib/dom.js';
import { dateClock } from '../lib/format.js';
import type { PageModel } from '../lib/model.js';
import type { Standing } from '../lib/wire.js';

const NAME_KEY = 'rockhour.who';
/** Those to acknowledge before the others. */
const STATE_ORDER: Readonly<Record<Standing['state'], number>> = {
  unacknowledged: 0,
  latched_unacknowledged: 1,
  returned_unacknowledged: 1,
  acknowledged: 2,
  latched_acknowledged: 2,
  normal: 3,
  shelved: 4,
  suppressed_by_design: 4,
  out_of_service: 4,
};
const PRIORITY_ORDER = { high: 0, medium: 1, low: 2 } as const;
const STATE_WORDS: Readonly<Record<Standing['state'], string>> = {
  unacknowledged: 'not acknowledged',
  latched_unacknowledged: 'latched, not acknowledged',
  returned_unacknowledged: 'returned to normal, not acknowledged',
  acknowledged: 'acknowledged',
  latched_acknowledged: 'latched, acknowledged',
  normal: 'normal',
  shelved: 'shelved',
  suppressed_by_design: 'suppressed by design',
  out_of_service: 'out of service',
};

/** Waits for somebody to acknowledge it. */
export function isOpen({ state }: Standing): boolean {
  return STATE_ORDER[state] < STATE_ORDER.acknowledged;
}

/** What asks for an answer first: open before acknowledged, alarms before alerts, by priority. */
export function inOrder(standing: readonly Standing[]): Standing[] {
  return [...standing].sort(
    (a, b) =>
      STATE_ORDER[a.state] - STATE_ORDER[b.state] ||
      (a.class === b.class ? 0 : a.class === 'alarm' ? -1 : 1) ||
      PRIORITY_ORDER[a.priority] - PRIORITY_ORDER[b.priority] ||
      b.time.localeCompare(a.time),
  );
}

function counted(count: number, name: string): string {
  return `${count} ${name}${count === 1 ? '' : 's'}`;
}

/** Alarms are pointed, alerts are square; filled until acknowledged. */
function sign(event: Standing): SVGElement {
  const shape = event.class === 'alarm' ? 'M11,2 L20,18 H2 Z' : 'M3,3 H19 V17 H3 Z';
  return s(
    'svg',
    { class: 'event-sign', width: 22, height: 20, 'aria-hidden': 'true' },
    s('path', { d: shape }),
    s('text', { x: 11, y: 15.5, 'text-anchor': 'middle' }, event.class === 'alarm' ? '!' : 'i'),
  );
}

/** One line on what is held back, by whom and until when. */
function heldLine(event: Standing, unitName: string): HTMLElement {
  const { shelved, out_of_service } = event;
  const by = shelved
    ? ` by ${shelved.by} until ${dateClock(shelved.until)}: ${shelved.why}`
    : out_of_service
      ? ` by ${out_of_service.by}: ${out_of_service.why}`
      : '';
  return h(
    'li',
    { 'data-id': event.id, 'data-state': event.state },
    `${event.kind.replaceAll('_', ' ')} · ${unitName} · ${event.subject}: ${STATE_WORDS[event.state]}${by}`,
  );
}

function item(event: Standing, unitName: string, acknowledge: () => void): HTMLElement {
  const open = isOpen(event);
  const button = h('button', { type: 'button' }, 'Acknowledge');
  button.addEventListener('click', acknowledge);
  const state = event.acknowledged_by
    ? `${STATE_WORDS[event.state]} by ${event.acknowledged_by}`
    : STATE_WORDS[event.state];
  return h(
    'li',
    {
      'data-id': event.id,
      'data-state': open ? event.state : 'acknowledged',
      'data-class': event.class,
      'data-priority': event.priority,
    },
    sign(event),
    h(
      'div',
      {},
      h(
        'p',
        { class: 'head' },
        h('strong', {}, `${event.class}, ${event.priority}`),
        ` · ${unitName} · ${event.subject}`,
      ),
      h('p', {}, event.message),
      h('p', { class: 'when' }, `${dateClock(event.time)} · ${state}`),
      open && button,
    ),
  );
}

/** What stands, of all units: an alarm of a unit that is not on the screen must not be missed. */
export function alarmsPanel(model: PageModel, api: Api, reload: () => Promise<void>): () => void {
  const who = h('input', { id: 'who', autocomplete: 'name', maxlength: 64, size: 14 });
  try {
    who.value = localStorage.getItem(NAME_KEY) ?? '';
  } catch {
    // Storage may be forbidden; the name is then typed anew at each visit.
  }
  const summary = h('p', { class: 'when', role: 'status', 'data-field': 'alarm-count' });
  const fault = h('p', { class: 'fault', role: 'alert' });
  const list = h('ul', { class: 'events', tabindex: 0, 'aria-label': 'Standing' });
  const heldSummary = h('summary', {});
  const heldList = h('ul', {});
  const held = h('details', { class: 'held-back' }, heldSummary, heldList);
  const head = byId('open-count');
  byId('alarms').append(
    summary,
    list,
    fault,
    h('p', { class: 'who' }, h('label', { for: 'who' }, 'Acknowledge as '), who),
  );

  async function acknowledge(event: Standing): Promise<void> {
    const name = who.value.trim();
    if (name === '') {
      setText(fault, 'Say first who acknowledges: a name is recorded with it.');
      who.focus();
      return;
    }
    try {
      localStorage.setItem(NAME_KEY, name);
    } catch {
      // As above.
    }
    try {
      await api.acknowledge(event.id, name);
      setText(fault, '');
    } catch (error) {
      setText(fault, `Not acknowledged. ${error instanceof AnswerError ? error.message : error}`);
    }
    await reload();
  }

  let shown = '';
  return () => {
    const events = inOrder(model.standing);
    const key = JSON.stringify([events, model.heldBack]);
    if (key === shown) return;
    shown = key;
    const nameOf = (unit: string) => model.units.find((one) => one.unit === unit)?.name ?? unit;
    const focused = document.activeElement?.closest<HTMLElement>('li[data-id]')?.dataset.id;
    list.replaceChildren(
      ...events.map((event) => item(event, nameOf(event.unit), () => void acknowledge(event))),
    );
    heldList.replaceChildren(...model.heldBack.map((one) => heldLine(one, nameOf(one.unit))));
    setText(heldSummary, `${model.heldBack.length} held back`);
    if (model.heldBack.length === 0) held.remove();
    else if (!held.isConnected) list.after(held);
    // The list was made anew: a keyboard user stays where he was.
    const same = [...list.children].find((one) => (one as HTMLElement).dataset.id === focused);
    same?.querySelector('button')?.focus();
    const open = events.filter(isOpen);
    const alarms = open.filter((event) => event.class === 'alarm').length;
    const rest = open.length - alarms;
    const counts = [
      alarms > 0 && counted(alarms, 'alarm'),
      rest > 0 && counted(rest, 'alert'),
    ].filter((words) => words !== false);
    setAttributes(head, { hidden: open.length === 0, 'data-alarms': alarms > 0 });
    setText(head, `${alarms > 0 ? '▲' : '■'} ${counts.join(', ')} to acknowledge`);
    setText(
      summary,
      events.length === 0
        ? 'Nothing stands.'
        : `${events.length} standing, ${open.length} to acknowledge`,
    );
  };
}
