import { type HoursLook, type Look, STORES, type StoreLook } from './look.js';

/** Hours after the start [h] whose looks stand in one line of the table. */
const SPANS = [
  [0, 6],
  [6, 12],
  [12, 30],
  [30, 90],
  [90, 180],
  [0, Number.POSITIVE_INFINITY],
] as const;
const DRAWS = 2000;

/** Rms errors beside rms sigmas, part by part, and truth over sigma with what chance leaves open. */
export function report(looks: readonly Look[]): string {
  const out: string[] = [];
  for (const [from, to] of SPANS) {
    const own = looks.filter((l) => l.at_h >= from && l.at_h < to);
    if (own.length === 0) continue;
    const span = to === Number.POSITIVE_INFINITY ? 'all' : `${from} to ${to} h`;
    for (const id of STORES) {
      out.push(`${span}, ${id}: ${storeLine(own.map((l) => l.stores[id]!))}`);
    }
    const hours = own.flatMap((l) => (l.hours === null ? [] : [l.hours]));
    if (hours.length > 0) out.push(`${span}, hours: ${hoursLine(hours)}`);
  }
  const ratios: [string, (l: Look) => number[]][] = [
    ['state of charge', (l) => STORES.map((id) => l.stores[id]!.error / l.stores[id]!.sigma)],
    ['stored heat', (l) => STORES.map((id) => l.stores[id]!.stored)],
    ['hours', (l) => (l.hours === null ? [] : [l.hours.error / l.hours.sigma])],
  ];
  for (const [name, of] of ratios) {
    const seeds = [...new Set(looks.map((l) => l.seed))];
    const bySeed = seeds.map((s) => looks.filter((l) => l.seed === s).flatMap(of));
    if (bySeed.every((r) => r.length === 0)) continue;
    const [low, high] = interval(bySeed);
    const each = bySeed.map((r) => rms(r).toFixed(2)).join(' ');
    const pooled = `${rms(bySeed.flat()).toFixed(2)} (${low.toFixed(2)} to ${high.toFixed(2)})`;
    out.push(`truth over sigma, ${name}: ${pooled}, by seed ${each}`);
  }
  return out.join('\n');
}

function storeLine(own: readonly StoreLook[]): string {
  const share = (of: (s: StoreLook) => number) => (100 * rms(own.map(of))).toFixed(3);
  const root = (v: number) => Math.sqrt(Math.max(0, v));
  const seen = (s: StoreLook) => root(s.sigma ** 2 - s.unseen_sigma ** 2);
  const parts = Object.keys(own[0]!.by).map((c) => `${c} ${share((s) => root(s.by[c]!))}`);
  return [
    `error ${share((s) => s.error)} % (at the strings ${share((s) => s.seen)},`,
    `beside them ${share((s) => s.unseen)}),`,
    `sigma ${share((s) => s.sigma)} % (at the strings ${share(seen)}: ${parts.join(', ')};`,
    `beside them ${share((s) => s.unseen_sigma)}, of that the wall ${share((s) => s.unseen_wall)});`,
    `heat capacity off ${share((s) => s.capacity)} %, sigma ${share((s) => s.capacity_sigma)} %`,
  ].join(' ');
}

function hoursLine(own: readonly HoursLook[]): string {
  const h = (of: (l: HoursLook) => number) => rms(own.map(of)).toFixed(3);
  const rest = (l: HoursLook) =>
    l.error - l.by_calibration - l.by_charge.reduce((sum, v) => sum + v, 0);
  return [
    `error ${h((l) => l.error)} h (calibration ${h((l) => l.by_calibration)}:`,
    `${STORES.map((id, s) => `rock ${id} ${h((l) => l.by_rock[s]!)}`).join(', ')},`,
    `machine ${h((l) => l.by_machine)};`,
    `${STORES.map((id, s) => `charge ${id} ${h((l) => l.by_charge[s]!)}`).join(', ')};`,
    `rest ${h(rest)}),`,
    `sigma ${h((l) => l.sigma)} h (calibration ${h((l) => l.sigma_calibration)},`,
    `profile and wall ${h((l) => l.sigma_profile)}, unseen flow ${h((l) => l.sigma_unseen)},`,
    `model ${h((l) => l.sigma_model)})`,
  ].join(' ');
}

const rms = (values: readonly number[]): number =>
  Math.sqrt(values.reduce((sum, v) => sum + v * v, 0) / values.length);

/**
 * 5 and 95 % of the pooled rms over draws of the seeds with replacement: figures of one seed are those
 * of one plant, whose errors last, so that the seed is the unit of chance. The draws are always the
 * same ones.
 */
function interval(bySeed: readonly (readonly number[])[]): [low: number, high: number] {
  let state = 1;
  const next = () => {
    // Park & Miller's minimal generator.
    state = (state * 48271) % 2147483647;
    return Math.floor((state / 2147483647) * bySeed.length);
  };
  const found = Array.from({ length: DRAWS }, () =>
    rms(bySeed.flatMap(() => bySeed[next()]!)),
  ).sort((a, b) => a - b);
  return [found[Math.floor(0.05 * DRAWS)]!, found[Math.floor(0.95 * DRAWS)]!];
}
