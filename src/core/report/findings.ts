import { CAUSES, PROBABLE } from '../watch/causeTable.js';
import type { WatchEvent } from '../watch/event.js';
import { INDICATOR_REASONS, type IndicatorReason, type IndicatorView } from '../watch/indicator.js';
import { INDICATOR_EVENTS } from '../watch/kinds.js';
import type { ReportData } from './reportData.js';
import { cycleTotals, median } from './totals.js';

/** `act`: look at it soon; `watch`: keep an eye on it; `note`: what bounds what the report can say. */
export type FindingLevel = 'act' | 'watch' | 'note';

export interface Finding {
  readonly level: FindingLevel;
  /** Store, string, sensor or unit. */
  readonly subject: string;
  readonly title: string;
  readonly text: string;
  /** Evidence lines, where there are any. */
  readonly evidence: readonly string[];
  /** What to look at on site; null where nothing. */
  readonly check: string | null;
}

/** A sequential test that has come this far is worth a look. */
const RISING_SCORE = 0.5;
/** Scans that are not of good quality, as a share, and missing time that are worth a note. */
const POOR_SHARE = 0.05;
const MISSING_SHARE = 0.01;
/** A round trip that fell by this over the span is worth a look [-]; common practice, no source. */
const TRIP_FALL = 0.02;

/** What a person should know first, the gravest first; never empty: that nothing was found is one, too. */
export function findingsOf(data: ReportData): Finding[] {
  const found = [
    ...degraded(data),
    ...over(data),
    ...sensors(data),
    ...efficiency(data),
    ...rising(data),
    ...coverage(data),
    ...undetermined(data),
  ];
  if (!found.some(({ level }) => level !== 'note')) found.unshift(nothing(data));
  const rank = { act: 0, watch: 1, note: 2 };
  return found
    .map((finding, i) => ({ finding, i }))
    .sort((a, b) => rank[a.finding.level] - rank[b.finding.level] || a.i - b.i)
    .map(({ finding }) => finding);
}

/** One finding per probable cause with what speaks for it, and one per degraded indicator left without. */
function degraded({ indicators, causes }: ReportData): Finding[] {
  const bad = indicators.filter(({ state }) => state === 'degraded');
  const found: Finding[] = [];
  const told = new Set<IndicatorView>();
  for (const store of new Set(bad.map(({ subject }) => subject.split('/')[0] as string))) {
    const own = bad.filter(({ subject }) => subject.split('/')[0] === store);
    const cause = causes.find((c) => c.subject === store || CAUSES[c.cause].of === 'unit');
    if (cause === undefined) continue;
    for (const view of own) told.add(view);
    const others = causes
      .filter((c) => c !== cause && (c.subject === store || CAUSES[c.cause].of === 'unit'))
      .filter(({ probability }) => probability >= 0.1)
      .map((c) => `${CAUSES[c.cause].words} (${percent(c.probability)})`);
    const likely = `${CAUSES[cause.cause].words} (${percent(cause.probability)})`;
    const isProbable = cause.probability >= PROBABLE;
    found.push({
      level: 'act',
      subject: store,
      title: isProbable
        ? `${CAUSES[cause.cause].words}, probably (${percent(cause.probability)})`
        : `${[...new Set(own.map(({ kind }) => words(kind)))].join(', ')}: no cause is probable by itself`,
      text: own.map(({ sentence }) => sentence).join(' '),
      evidence: [
        ...(isProbable ? [] : [`Likeliest, of what would show here: ${likely}.`]),
        // What the text has said already is not said twice.
        ...cause.evidence.filter((line) => !own.some(({ sentence }) => line.includes(sentence))),
        ...(others.length > 0
          ? [`${isProbable ? 'Less probable' : 'Also'}: ${others.join(', ')}.`]
          : []),
      ],
      check: cause.check,
    });
  }
  for (const view of bad) {
    if (told.has(view)) continue;
    const { subject, sentence } = view;
    found.push({
      ...{ level: 'act', subject, title: words(view.kind), text: sentence },
      ...{ evidence: [], check: null },
    });
  }
  return found;
}

function sensors({ sensors }: ReportData): Finding[] {
  const stores = new Set(sensors.map(({ store }) => store));
  return [...stores].flatMap((store): Finding[] => {
    const bad = sensors.filter((s) => s.store === store && s.now !== null);
    if (bad.length === 0) return [];
    const all = sensors.filter((s) => s.store === store).length;
    return [
      {
        level: 'watch',
        subject: store,
        title: `${bad.length} of ${all} thermocouples are not believed`,
        text: 'The estimate goes on without them, with a larger sigma where they hang.',
        evidence: bad.map(
          ({ id, now }) =>
            `${id}: ${now?.verdict} since ${minute(now?.since ?? '')}. ${now?.evidence ?? ''}`,
        ),
        check: 'the sensors of the table below, those of one group first',
      },
    ];
  });
}

/** Round trips of the last third against those of the first, where there are at least three of each. */
function efficiency({ cycles }: ReportData): Finding[] {
  const trips = cycles.flatMap(({ round_trip }) => (round_trip === null ? [] : [round_trip]));
  const third = Math.floor(trips.length / 3);
  if (third < 3) return [];
  const [first, last] = [median(trips.slice(0, third)), median(trips.slice(-third))];
  if (first === null || last === null || first - last < TRIP_FALL) return [];
  return [
    {
      level: 'watch',
      subject: 'unit',
      title: 'The round trip has fallen',
      text: `From ${percent(first)} (median of the first ${third}) to ${percent(last)} (the last ${third}).`,
      evidence: [],
      check: 'fronts and losses below; how long the unit stood between charge and discharge',
    },
  ];
}

function rising({ indicators }: ReportData): Finding[] {
  return indicators
    .filter(({ state, score }) => state === 'normal' && (score ?? 0) >= RISING_SCORE)
    .map(({ kind, subject, sentence, score }) => ({
      ...{
        level: 'watch',
        subject,
        title: `${words(kind)}: not decided, ${percent(score ?? 0)} of the way`,
      },
      ...{ text: sentence, evidence: [], check: null },
    }));
}

function coverage({ readings, cycles, from, to }: ReportData): Finding[] {
  const found: Finding[] = [];
  const note = (title: string, text: string) =>
    found.push({ level: 'note', subject: 'unit', title, text, evidence: [], check: null });
  const { scans, quality, missing_h, longest_gap_h } = readings;
  if (scans === 0) {
    note('No scans', 'The local history has no estimate of this unit in this span.');
    return found;
  }
  const span_h = (Date.parse(to) - Date.parse(from)) / 3_600_000;
  if (missing_h > MISSING_SHARE * span_h)
    note(
      'Readings are missing',
      `${missing_h.toFixed(1)} h of ${span_h.toFixed(0)} h have no scan; the longest gap is ${longest_gap_h.toFixed(1)} h.`,
    );
  const poor = scans - quality.good;
  if (poor > POOR_SHARE * scans)
    note(
      'Not all estimates are good',
      `${percent(poor / scans)} of the scans are not of good quality: ${quality.degraded} degraded, ${quality.blind} blind, ${quality.stale} stale.`,
    );
  if (readings.thinned_before !== null)
    note(
      'Older times are kept thinned',
      `Before ${minute(readings.thinned_before)} one estimate in ${readings.thinned_to_s} s is kept: shorter gaps and what lay between are not in this report. Runs, alarms and alerts are whole.`,
    );
  const early = cycles.filter((cycle) => cycle.from < from).length;
  if (early > 0)
    note(
      'Runs from before the span',
      `${early} of ${cycles.length} runs began before it. A run belongs, whole, to the span in which it ends.`,
    );
  const { incomplete } = cycleTotals(cycles);
  if (incomplete > 0)
    note(
      'Runs that are incomplete',
      `${incomplete} of ${cycles.length} runs have a gap, an unknown flow or power, or began before the record; their sums may be too small.`,
    );
  return found;
}

/** Why an indicator is left open, as a person says it. */
const OPEN_WORDS: Readonly<Record<IndicatorReason, string>> = {
  not_instrumented: 'cannot be told with these instruments',
  learning: 'still learn what is healthy',
  not_exercised: 'wait for the plant to do what would show it',
  too_uncertain: 'are too uncertain',
};

function undetermined({ indicators }: ReportData): Finding[] {
  const open = indicators.filter(({ state }) => state === 'undetermined');
  if (open.length === 0) return [];
  const counts = INDICATOR_REASONS.flatMap((reason) => {
    const count = open.filter((view) => view.reason === reason).length;
    return count === 0 ? [] : [`${count} ${OPEN_WORDS[reason]}`];
  });
  return [
    {
      level: 'note',
      subject: 'unit',
      title: `${open.length} of ${indicators.length} indicators are undecided`,
      text: `That is not the same as healthy: ${counts.join(', ')}.`,
      evidence: open.map(({ sentence }) => sentence),
      check: null,
    },
  ];
}

/** What was degraded within the span and no longer is at its end: raised, or returned. */
function over({ events, indicators, degraded_at_start, from }: ReportData): Finding[] {
  const still = new Set(
    indicators
      .filter(({ state }) => state === 'degraded')
      .map(({ kind, subject }) => `${INDICATOR_EVENTS[kind]}/${subject}`),
  );
  const of = new Map<string, WatchEvent[]>();
  for (const event of events) {
    const key = `${event.kind}/${event.subject}`;
    if (!DEGRADATIONS.has(event.kind) || still.has(key)) continue;
    of.set(key, [...(of.get(key) ?? []), event]);
  }
  for (const { kind, subject } of degraded_at_start) {
    const key = `${INDICATOR_EVENTS[kind]}/${subject}`;
    if (!still.has(key) && !of.has(key)) of.set(key, []);
  }
  return [...of].map(([key, list]): Finding => {
    const raised = list.filter(({ transition }) => transition === 'raised');
    const last = list.at(-1);
    const [kind = '', ...subject] = key.split('/');
    const since = list[0]?.transition === 'raised' ? list[0].time : from;
    const until = last?.transition === 'returned' ? ` to ${minute(last.time)}` : '';
    return {
      level: 'watch',
      subject: subject.join('/'),
      title: `${words(kind)}: was so from ${minute(since)}${until}, not at the end of the span`,
      text:
        raised.length > 1 ? `Raised ${raised.length} times, the last time so:` : 'It was told so:',
      evidence: [raised.at(-1)?.message ?? last?.message ?? 'It began before the span.'],
      check: null,
    };
  });
}

const DEGRADATIONS: ReadonlySet<string> = new Set(Object.values(INDICATOR_EVENTS));

function minute(iso: string): string {
  return `${iso.slice(0, 10)} ${iso.slice(11, 16)}`;
}

function nothing({ indicators, cycles }: ReportData): Finding {
  const normal = indicators.filter(({ state }) => state === 'normal').length;
  return {
    level: 'note',
    subject: 'unit',
    title:
      normal > 0
        ? 'Nothing that needs attention was found'
        : 'Nothing was found, and little was looked at',
    text:
      indicators.length === 0
        ? `No indicator was kept, so this rests on ${cycles.length} runs and the thermocouples alone.`
        : `Of ${indicators.length} indicators ${normal} are as healthy and none is degraded, over ${cycles.length} runs.`,
    evidence: [],
    check: null,
  };
}

export function percent(share: number): string {
  return `${(100 * share).toFixed(share > 0.095 ? 0 : 1)} %`;
}

function words(kind: string): string {
  const text = kind.replaceAll('_', ' ');
  return text.charAt(0).toUpperCase() + text.slice(1);
}
