import { byId, h, setText, unitText } from '../lib/dom.js';
import { DASH, fixed, MODE_WORDS, percent, power, QUALITY_WORDS } from '../lib/format.js';
import type { PageModel, UnitEntry } from '../lib/model.js';
import type { DispatchAnswer } from '../lib/wire.js';

/** The answer at rated power, or the one nearest to it. */
export function nearestToRated(entry: UnitEntry | null): DispatchAnswer | null {
  const rated = entry?.definition?.rated_power_MW_el;
  const answers = entry?.state?.dispatch?.answers ?? [];
  if (rated === undefined) return answers[0] ?? null;
  const away = (answer: DispatchAnswer) => Math.abs(answer.power_MW - rated);
  return answers.reduce<DispatchAnswer | null>(
    (best, answer) => (best === null || away(answer) < away(best) ? answer : best),
    null,
  );
}

/** Flow and power are positive while charging: what the sign means, in words. */
function bySign(value: number | null | undefined, positive: string, negative: string): string {
  if (value === null || value === undefined || value === 0) return '';
  return value > 0 ? positive : negative;
}

interface Figure {
  field: string;
  label: string;
  unit?: string;
  value(entry: UnitEntry): string;
  under?(entry: UnitEntry): string;
}

const FIGURES: Figure[] = [
  {
    field: 'soc',
    label: 'State of charge',
    unit: '%',
    value: ({ state }) => percent(state?.estimate?.state_of_charge),
    under: ({ definition }) =>
      definition === null
        ? ''
        : `of ${fixed(definition.rated_power_MW_el * definition.rated_hours, 1)} MWh electric, rated`,
  },
  {
    field: 'dispatchable',
    label: 'Dispatchable, firm',
    unit: 'MWh_el',
    value: (entry) => fixed(nearestToRated(entry)?.energy_MWh_el.p90, 2),
    under: (entry) => {
      const answer = nearestToRated(entry);
      return answer === null ? '' : `p90 at ${power(answer.power_MW)} MW electric`;
    },
  },
  {
    field: 'mode',
    label: 'Mode',
    value: ({ state }) => (state?.estimate ? MODE_WORDS[state.estimate.mode] : DASH),
  },
  {
    field: 'power',
    label: 'Net power',
    unit: 'MW_el',
    value: ({ state }) => fixed(state?.power_MW_el, 2),
    under: ({ state }) => bySign(state?.power_MW_el, 'drawn to charge', 'delivered'),
  },
  {
    field: 'flow',
    label: 'Flow',
    unit: 'kg/s',
    value: ({ state }) => fixed(state?.flow_kg_s, 1),
    under: ({ state }) => bySign(state?.flow_kg_s, 'charging way', 'discharging way'),
  },
  {
    field: 'quality',
    label: 'Estimate',
    value: ({ state }) => (state?.estimate ? state.estimate.quality : DASH),
    under: ({ state }) => {
      const words = state?.estimate ? QUALITY_WORDS[state.estimate.quality] : '';
      return words.split(': ')[1] ?? '';
    },
  },
];

/** The strip of figures that say what the unit is doing. */
export function figuresPanel(model: PageModel): () => void {
  const list = h('dl', { class: 'strip' });
  const cells = FIGURES.map((figure) => {
    const value = h('span', { 'data-field': figure.field });
    const under = h('small');
    const amount = h('dd', {}, value, figure.unit ? unitText(figure.unit) : null, under);
    list.append(h('div', { 'data-figure': figure.field }, h('dt', {}, figure.label), amount));
    return { figure, value, under };
  });
  byId('figures').append(list);

  return () => {
    const entry = model.unit;
    for (const { figure, value, under } of cells) {
      setText(value, entry === null ? DASH : figure.value(entry));
      setText(under, entry === null ? '' : (figure.under?.(entry) ?? ''));
    }
  };
}
