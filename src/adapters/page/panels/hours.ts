import { AnswerError, type Api } from '../lib/api.js';
import { byId, h, s, setAttributes, setText, unitText } from '../lib/dom.js';
import {
  ageText,
  clock,
  DASH,
  END_WORDS,
  fixed,
  hoursText,
  LIMIT_WORDS,
  power,
} from '../lib/format.js';
import { ageNow, type PageModel } from '../lib/model.js';
import { roundHours, typedPower } from '../lib/powers.js';
import type { AskedHours, LimitedAnswer } from '../lib/wire.js';

const LEVELS = [
  { key: 'p90', label: 'firm, p90' },
  { key: 'p50', label: 'p50' },
  { key: 'p10', label: 'p10' },
] as const;

const STALE = 'Stale: the unit has moved on since the estimate that this stands on.';

/** Bar of one answer: sure up to p90, open up to p10, a mark at p50. */
function hoursBar() {
  const sure = s('rect', { class: 'sure', x: 0, y: 3, height: 8 });
  const maybe = s('rect', { class: 'maybe', y: 5, height: 4 });
  const middle = s('rect', { class: 'middle', y: 0, width: 0.8, height: 14 });
  const rail = s('rect', { class: 'rail', x: 0, y: 6.5, width: 100, height: 1 });
  const element = s(
    'svg',
    { class: 'bar', viewBox: '0 0 100 14', preserveAspectRatio: 'none', 'aria-hidden': 'true' },
    rail,
    sure,
    maybe,
    middle,
  );
  return {
    element,
    update({ p90, p50, p10 }: LimitedAnswer['hours'], full_h: number): void {
      const share = (hours: number) => Math.max(0, Math.min(100, (100 * hours) / full_h));
      setAttributes(sure, { width: share(p90) });
      setAttributes(maybe, { x: share(p90), width: Math.max(0.4, share(p10) - share(p90)) });
      setAttributes(middle, { x: share(p50) - 0.4 });
    },
  };
}

/** One power: the firm hours large, the likely and the hopeful ones small, with the energy. */
function hoursRow() {
  const at = h('strong');
  const ends = h('span', { class: 'ends' });
  const bar = hoursBar();
  const levels = LEVELS.map(({ key, label }) => {
    const hours = h('dd', { class: 'time', 'data-field': key });
    const energy = h('span', { 'data-field': `energy-${key}` });
    const line = h(
      'div',
      { class: key },
      h('dt', { class: 'p' }, label),
      hours,
      h('dd', { class: 'energy' }, energy, unitText('MWh_el')),
    );
    return { key, hours, energy, line };
  });
  const row = h(
    'li',
    {},
    h('p', { class: 'head' }, h('span', {}, 'at ', at, unitText('MW_el')), ends),
    bar.element,
    h('dl', {}, ...levels.map((level) => level.line)),
  );
  return {
    row,
    update(answer: LimitedAnswer, full_h: number): void {
      setAttributes(row, { 'data-power': answer.power_MW });
      setText(at, power(answer.power_MW));
      const { ends_by, limited_by } = answer;
      const limit = limited_by === null ? '' : `limited: ${LIMIT_WORDS[limited_by]} · `;
      setText(ends, `${limit}ends: ${END_WORDS[ends_by]}`);
      for (const { key, hours, energy } of levels) {
        setText(hours, hoursText(answer.hours[key]));
        setText(energy, fixed(answer.energy_MWh_el[key], 2));
      }
      bar.update(answer.hours, full_h);
    },
  };
}

type Row = ReturnType<typeof hoursRow>;

/** A list of rows that grows and shrinks with its answers. */
function rowList(list: HTMLElement) {
  const rows: Row[] = [];
  return (answers: readonly LimitedAnswer[], full_h: number) => {
    while (rows.length < answers.length) {
      const row = hoursRow();
      rows.push(row);
      list.append(row.row);
    }
    while (rows.length > answers.length) rows.pop()!.row.remove();
    for (const [i, answer] of answers.entries()) rows[i]!.update(answer, full_h);
  };
}

/** Hours at the configured powers and at one that the user types. */
export function hoursPanel(model: PageModel, api: Api): () => void {
  const list = h('ol', { class: 'hours' });
  const mark = h('p', { class: 'fault', 'data-field': 'asked-stale' });
  const asked = h('ol', { class: 'hours asked', 'aria-live': 'polite' });
  const when = h('p', { class: 'when' });
  const input = h('input', {
    id: 'power',
    inputmode: 'decimal',
    autocomplete: 'off',
    size: 6,
    'aria-describedby': 'power-fault',
  });
  const fault = h('p', { id: 'power-fault', class: 'fault', role: 'status' });
  const form = h(
    'form',
    { class: 'ask' },
    h('label', { for: 'power' }, 'At another power'),
    h('span', { class: 'entry' }, input, unitText('MW_el'), h('button', {}, 'Work out')),
  );
  byId('hours').append(when, list, form, fault, mark, asked);
  const drawList = rowList(list);
  const drawAsked = rowList(asked);

  let question: { unit: string; power_MW: number; basis: string } | null = null;
  let answer: AskedHours | null = null;

  async function ask(unit: string, power_MW: number): Promise<void> {
    const mine = { unit, power_MW, basis: basisOf() };
    question = mine;
    try {
      const found = await api.hours(unit, power_MW);
      if (question !== mine) return;
      answer = found;
      setText(fault, '');
    } catch (error) {
      if (question !== mine) return;
      answer = null;
      setText(fault, error instanceof AnswerError ? error.message : String(error));
    }
    model.changed();
  }

  /** What the answer rests on; when it changes the typed power is asked again. */
  function basisOf(): string {
    const state = model.unit?.state;
    return `${state?.dispatch?.time} ${state?.estimate?.mode}`;
  }

  form.addEventListener('submit', (event) => {
    event.preventDefault();
    const power_MW = typedPower(input.value);
    const unit = model.selected;
    setAttributes(input, { 'aria-invalid': power_MW === null ? 'true' : null });
    if (power_MW === null || unit === null) {
      question = null;
      answer = null;
      setText(fault, `A power in MW is a number above 0, as in 1.8; "${input.value}" is not.`);
      model.changed();
      return;
    }
    void ask(unit, power_MW);
  });

  return () => {
    const entry = model.unit;
    if (question !== null && question.unit !== entry?.unit) {
      question = null;
      answer = null;
    }
    const live = model.connection === 'live';
    if (live && answer !== null && question !== null && question.basis !== basisOf()) {
      void ask(question.unit, question.power_MW);
    }
    const dispatch = entry?.state?.dispatch ?? null;
    const answers = dispatch?.answers ?? [];
    const all = [...answers, ...(answer?.answers ?? [])];
    const full_h = roundHours(Math.max(0.5, ...all.map((one) => one.hours.p10)));
    drawList(answers, full_h);
    drawAsked(answer?.answers ?? [], full_h);
    setText(mark, answer?.stale ? STALE : '');
    const told = entry?.state?.age_s ?? null;
    const now = entry === null ? null : ageNow(entry);
    const since = told === null || now === null ? 0 : Math.max(0, now - told);
    const age = dispatch === null || dispatch.age_s === null ? null : dispatch.age_s + since;
    setText(
      when,
      dispatch === null
        ? `${DASH} not worked out yet`
        : `from the estimate of ${clock(dispatch.time)}, ${ageText(age)} old · bars to ${full_h} h`,
    );
  };
}
