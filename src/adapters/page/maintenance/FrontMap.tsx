import type { Mode } from '../../../core/definitions.js';
import type { StoreDefinition } from '../lib/wire.js';
import { useWidth } from '../parts/useWidth.js';
import { frontsAt, gapsOf, secondsOf } from './moments.js';
import type { Playback, PlayedMoment } from './wire.js';

const LANE = 46;
/** Above each lane, for its name. */
const GAP = 18;
const MODES = 9;
const AXIS = 18;
/** Half a thumb of the slider below: both have the same scale. */
export const INSET = 9;

const DAY_S = 86_400;
const STEPS_S = [1, 2, 3, 6, 12].map((h) => h * 3600).concat([1, 2, 7, 14].map((d) => d * DAY_S));

/**
 * Where the fronts stood over time, one lane per store in the sense of its bed, with the chosen moment
 * as a line across: what the slider below moves along.
 */
export function FrontMap({
  playback,
  stores,
  at_s,
  onChoose,
}: {
  playback: Playback;
  stores: readonly StoreDefinition[];
  at_s: number;
  onChoose(at_s: number): void;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const { profiles, every_s } = playback;
  const first = profiles[0];
  const last = profiles.at(-1);
  const [from, to] = first && last ? [secondsOf(first), secondsOf(last)] : [0, 1];
  const x = (s: number) => INSET + ((s - from) / Math.max(1, to - from)) * (width - 2 * INSET);
  const topOf = (k: number) => GAP + k * (LANE + GAP);
  const modesAt = topOf(stores.length) - GAP + 8;
  const height = modesAt + MODES + AXIS;
  const gaps = gapsOf(profiles, every_s);
  const choose = (event: PointerEvent) => {
    if (event.buttons !== 1) return;
    const { left } = (event.currentTarget as Element).getBoundingClientRect();
    const share = (event.clientX - left - INSET) / (width - 2 * INSET);
    onChoose(from + Math.min(1, Math.max(0, share)) * (to - from));
  };
  return (
    <div ref={ref} class="rock-map">
      {width > 0 && (
        <svg
          width={width}
          height={height}
          role="img"
          aria-label={`Fronts of ${stores.map(({ id }) => id).join(' and ')} over time`}
          onPointerDown={choose}
          onPointerMove={choose}
        >
          {stores.map((store, k) => (
            <Lane key={store.id} store={store} top={topOf(k)} right={width} />
          ))}
          {stores.map((store, k) => (
            <path
              key={store.id}
              class="course"
              d={courseOf(profiles, store, every_s, x, topOf(k))}
            />
          ))}
          <Modes profiles={profiles} every_s={every_s} x={x} top={modesAt} />
          {gaps.map(([a, b]) => (
            <g key={a} class="gap">
              <rect x={x(a)} width={x(b) - x(a)} height={modesAt + MODES} />
              {x(b) - x(a) > 84 && (
                <text x={(x(a) + x(b)) / 2} y={topOf(0) + LANE / 2} text-anchor="middle">
                  nothing stored
                </text>
              )}
            </g>
          ))}
          {ticksOf(from, to, width).map((s) => (
            <g key={s} class="tick">
              <path d={`M${x(s)},0 V${modesAt + MODES + 4}`} />
              <text x={x(s)} y={height - 2} text-anchor={anchorAt(x(s), width)}>
                {tickText(s)}
              </text>
            </g>
          ))}
          <path class="chosen" d={`M${x(at_s)},0 V${modesAt + MODES + 4}`} />
        </svg>
      )}
      <p class="rock-key">
        Fronts over time, each in its bed. Below them the unit: solid discharging, outlined
        charging, a thin line standing.
      </p>
    </div>
  );
}

function Lane({ store, top, right }: { store: StoreDefinition; top: number; right: number }) {
  return (
    <g class="lane">
      <path
        d={`M${INSET},${top + 0.5} H${right - INSET} M${INSET},${top + LANE - 0.5} H${right - INSET}`}
      />
      <text x={INSET} y={top - 5}>
        {`${store.id}, from its top down`}
      </text>
    </g>
  );
}

/** A dot per front and moment, joined where there is one front and nothing is missing between. */
function courseOf(
  profiles: readonly PlayedMoment[],
  store: StoreDefinition,
  every_s: number,
  x: (s: number) => number,
  top: number,
): string {
  const down = store.charge_inlet_at === 'top';
  const y = (m: number) => top + LANE * (down ? m / store.length_m : 1 - m / store.length_m);
  let pen: number | null = null;
  let path = '';
  for (const moment of profiles) {
    const fronts = frontsAt(moment, store.id);
    const at_s = secondsOf(moment);
    const place = (m: number) => `${x(at_s).toFixed(1)},${y(m).toFixed(1)}`;
    if (fronts.length !== 1) {
      pen = null;
      for (const front of fronts) path += `M${place(front)}h1.5`;
      continue;
    }
    const joined = pen !== null && at_s - pen <= 2 * every_s;
    path += joined ? `L${place(fronts[0]!)}` : `M${place(fronts[0]!)}h0.5`;
    pen = at_s;
  }
  return path;
}

/** What the unit did: solid while discharging, in outline while charging, a thin line while standing. */
function Modes({
  profiles,
  every_s,
  x,
  top,
}: {
  profiles: readonly PlayedMoment[];
  every_s: number;
  x: (s: number) => number;
  top: number;
}) {
  const runs: { mode: Mode; from: number; to: number }[] = [];
  for (const moment of profiles) {
    const at = secondsOf(moment);
    const run = runs.at(-1);
    const mode = moment.estimate?.mode;
    const near = run !== undefined && at - run.to <= 2 * every_s;
    if (near) run.to = at;
    if (mode !== undefined && (!near || run.mode !== mode)) runs.push({ mode, from: at, to: at });
  }
  return (
    <g class="modes">
      {runs.map(({ mode, from, to }) =>
        mode === 'stand' ? (
          <path key={from} d={`M${x(from)},${top + MODES / 2} H${x(to)}`} />
        ) : (
          <rect
            key={from}
            data-mode={mode}
            x={x(from) + 0.5}
            y={top + 1}
            width={Math.max(1, x(to) - x(from) - 1)}
            height={MODES - 2}
          />
        ),
      )}
    </g>
  );
}

/** Half a word of a tick: where the edge is nearer, it stands beside its line. */
const HALF_TICK = 18;

function anchorAt(x: number, width: number): 'start' | 'middle' | 'end' {
  if (x < HALF_TICK) return 'start';
  return x > width - HALF_TICK ? 'end' : 'middle';
}

/** Whole hours or days of this browser's clock, as many as there is room for. */
function ticksOf(from: number, to: number, width: number): number[] {
  const most = Math.max(2, Math.floor(width / 74));
  const step = STEPS_S.find((size) => (to - from) / size <= most) ?? 28 * DAY_S;
  const offset = new Date(from * 1000).getTimezoneOffset() * 60;
  const first = Math.ceil((from - offset) / step) * step + offset;
  const ticks: number[] = [];
  for (let s = first; s <= to && ticks.length < 60; s += step) ticks.push(s);
  return ticks;
}

function tickText(seconds: number): string {
  const at = new Date(seconds * 1000);
  const two = (value: number) => String(value).padStart(2, '0');
  return at.getHours() === 0
    ? `${two(at.getMonth() + 1)}-${two(at.getDate())}`
    : `${two(at.getHours())}:${two(at.getMinutes())}`;
}
