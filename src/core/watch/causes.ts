import { CAUSE_KINDS, CAUSES, type CauseKind } from './causeTable.js';
import { type IndicatorKind, type IndicatorView, UNIT_INDICATORS } from './indicator.js';
import { sideOf } from './side.js';

export { CAUSE_KINDS, type CauseKind } from './causeTable.js';

export interface CauseView {
  readonly cause: CauseKind;
  /** Store or unit. */
  readonly subject: string;
  /** Of all explanations looked at, 0..1. */
  readonly probability: number;
  /** What speaks for it and against it, each a plain sentence. */
  readonly evidence: readonly string[];
  /** What to look at on site. */
  readonly check: string;
}

/** What a unit's indicators show, and what is probably behind it. */
export interface WatchView {
  readonly time: string;
  readonly unit: string;
  readonly indicators: readonly IndicatorView[];
  /** Most probable first within a subject; empty while nothing is degraded. */
  readonly causes: readonly CauseView[];
}

/** The states of all indicators as one text: two views are alike in state where it is. */
export function statesOf({ indicators }: WatchView): string {
  return indicators.map(({ kind, subject, state }) => `${kind}/${subject}=${state}`).join(' ');
}

/** Chance that an indicator decides `degraded` where the cause has nothing to do with it. */
const STRAY = 0.02;
/** Explanations less probable than this are not told. */
const LEAST = 0.05;

/** By the first of the views: those of a scan are mostly the very same as of the scan before. */
const explained = new WeakMap<
  IndicatorView,
  { readonly views: readonly IndicatorView[]; readonly causes: readonly CauseView[] }
>();

/**
 * Explanations of what is degraded: Bayes' rule over the causes of `CAUSES`, one at a time, on the
 * indicators of a store, those of the other stores and of the unit, taken as independent given the
 * cause. An indicator counts by how far its sequential test has come (score s): with chance p that
 * the cause shows in it, s p + (1 - s)(1 - p) / c, where c = 2 for what is still normal: a fault shows
 * later in one indicator than in another, so that what is not seen yet speaks half against it only.
 * What is undetermined counts nothing. Two faults at once are each held against all that is seen: the
 * stronger wins.
 *
 * Worked out anew only where a view has changed.
 *
 * @param views of one unit, all scans' newest
 * @returns of each store with something degraded, then of the unit, most probable first; causes of
 *   the unit once, with the store where they are most probable as reason
 */
export function causesOf(views: readonly IndicatorView[]): readonly CauseView[] {
  const [first] = views;
  if (first === undefined) return [];
  const known = explained.get(first);
  const same =
    known?.views.length === views.length && known.views.every((view, i) => view === views[i]);
  if (known !== undefined && same) return known.causes;
  const causes = causesFor(views);
  explained.set(first, { views, causes });
  return causes;
}

function causesFor(views: readonly IndicatorView[]): CauseView[] {
  const degraded = views.filter(({ state }) => state === 'degraded');
  if (degraded.length === 0) return [];
  const stores = [
    ...new Set(views.filter(({ kind }) => !UNIT_INDICATORS.has(kind)).map((v) => storeOf(v))),
  ];
  const hit = stores.filter((store) =>
    degraded.some((v) => !UNIT_INDICATORS.has(v.kind) && storeOf(v) === store),
  );
  const unit = views.find(({ kind }) => UNIT_INDICATORS.has(kind))?.subject ?? '';
  const told: CauseView[] = [];
  for (const subject of hit.length > 0 ? hit : [stores[0] ?? unit]) {
    const here = strongest(
      views.filter((v) => UNIT_INDICATORS.has(v.kind) || storeOf(v) === subject),
    );
    const there = strongest(
      views.filter((v) => !UNIT_INDICATORS.has(v.kind) && storeOf(v) !== subject),
    );
    for (const found of explain(here, there)) {
      const ofUnit = CAUSES[found.cause].of === 'unit';
      const known = told.findIndex((t) => ofUnit && t.cause === found.cause);
      const view = { ...found, subject: ofUnit ? unit || subject : subject };
      if (known < 0) told.push(view);
      else if (told[known]!.probability < view.probability) told[known] = view;
    }
  }
  return told
    .filter(({ probability }) => probability >= LEAST)
    .sort((a, b) => b.probability - a.probability);
}

function storeOf({ subject }: IndicatorView): string {
  return subject.split('/')[0] as string;
}

type Strongest = ReadonlyMap<IndicatorKind, IndicatorView>;

/** Of several subjects of a kind (strings, ends) the one that is furthest; undetermined ones only alone. */
function strongest(views: readonly IndicatorView[]): Strongest {
  const best = new Map<IndicatorKind, IndicatorView>();
  const weight = (v: IndicatorView) => (v.state === 'undetermined' ? -1 : seen(v));
  for (const view of views) {
    const known = best.get(view.kind);
    if (known === undefined || weight(view) > weight(known)) best.set(view.kind, view);
  }
  return best;
}

/** How far an indicator has come towards degraded, 0..1. */
function seen(view: IndicatorView): number {
  return view.state === 'degraded' ? 1 : Math.min(0.9, view.score ?? 0);
}

function explain(here: Strongest, there: Strongest): Omit<CauseView, 'subject'>[] {
  const scored = CAUSE_KINDS.map((cause) => {
    const note = CAUSES[cause];
    let log = Math.log(note.prior);
    for (const [kind, view] of here) log += Math.log(likelihood(view, note.shows[kind] ?? STRAY));
    for (const [kind, view] of there)
      log += Math.log(likelihood(view, note.other?.[kind] ?? STRAY));
    return { cause, log: log + coldness(cause, here) };
  });
  const most = Math.max(...scored.map(({ log }) => log));
  const total = scored.reduce((sum, { log }) => sum + Math.exp(log - most), 0);
  return scored.map(({ cause, log }) => ({
    cause,
    probability: Math.exp(log - most) / total,
    evidence: evidenceOf(cause, here, there),
    check: CAUSES[cause].check,
  }));
}

function likelihood(view: IndicatorView, chance: number): number {
  if (view.state === 'undetermined') return 1;
  const s = seen(view);
  return s * chance + (1 - s) * (1 - chance / 2);
}

/** Pressure drop that is too high only while the bed is below freezing is frost, else it is not. */
function coldness(cause: CauseKind, here: Strongest): number {
  const drop = here.get('pressure_drop');
  if (drop?.state !== 'degraded') return cause === 'frost' ? Math.log(STRAY) : 0;
  const only = drop.only_while_cold ?? null;
  if (cause === 'frost') return Math.log(only === null ? 0.5 : only ? 0.95 : STRAY);
  return Math.log(only === true ? 0.1 : 1);
}

/**
 * What is degraded and expected speaks for it; what is degraded and not expected against, and what is
 * expected and on the healthy side. A value between, or beyond its limit and not decided, is neither.
 */
function evidenceOf(cause: CauseKind, here: Strongest, there: Strongest): string[] {
  const { shows, other } = CAUSES[cause];
  const lines: string[] = [];
  const say = (view: IndicatorView, chance: number) => {
    if (view.state === 'degraded' && chance >= 0.3) lines.push(`For it: ${view.sentence}`);
    else if (view.state === 'degraded') lines.push(`Not explained by it: ${view.sentence}`);
    else if (chance < 0.5) return;
    else if (view.state === 'normal' && sideOf(view) === 'healthy')
      lines.push(`Against it, so far: ${view.sentence}`);
    else if (view.state === 'normal') lines.push(`Not decided yet: ${view.sentence}`);
    else lines.push(`Not known: ${view.sentence}`);
  };
  for (const [kind, view] of here) say(view, shows[kind] ?? STRAY);
  for (const [kind, view] of there) {
    const chance = other?.[kind];
    if (chance !== undefined) say(view, chance);
  }
  return lines;
}
