import { ticks } from '../drawing/frame.js';
import type { StoreDefinition, StoreProfile, StoreState } from '../lib/wire.js';
import { useWidth } from '../parts/useWidth.js';

const LEFT = 62;
const RIGHT = 14;
const TOP = 10;
const PLOT = 210;
const ROW = 26;
const AXIS = 34;

/** The line of a string, by its order of radius: solid, dashed, dotted, dash-dotted. */
export const dashOf = (k: number): string => ['', '9 4', '2 3', '9 3 2 3'][k % 4] ?? '';

/**
 * Profiles of all strings over the distance from the charge inlet, and at the same scale a row per
 * string with its front by the bed model and by the front view.
 */
export function StringsPlot({
  store,
  own,
  profile,
}: {
  store: StoreDefinition;
  own: StoreState | null;
  profile: StoreProfile | null;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const { length_m, reference_cold_degC: low, reference_hot_degC: high, strings } = store;
  const margin = 0.07 * (high - low);
  const span = Math.max(1, width - LEFT - RIGHT);
  const x = (m: number) => LEFT + (Math.min(length_m, Math.max(0, m)) / length_m) * span;
  const y = (degC: number) => {
    const share = (degC - low + margin) / (high - low + 2 * margin);
    return TOP + PLOT * (1 - Math.min(1, Math.max(0, share)));
  };
  const rows = TOP + PLOT + 12;
  const bottom = rows + strings.length * ROW;
  return (
    <div ref={ref}>
      {width > 0 && (
        <svg
          class="rock-plot"
          width={width}
          height={bottom + AXIS}
          role="img"
          aria-label={`Profiles of the strings of store ${store.id}; the figures are in the table below`}
        >
          {ticks(low, high, 5).map((degC) => (
            <g key={degC} class="grid">
              <path d={`M${LEFT},${y(degC)} H${width - RIGHT}`} />
              <text x={LEFT - 6} y={y(degC) + 4} text-anchor="end">
                {String(degC).replace('-', '−')}
              </text>
            </g>
          ))}
          {ticks(0, length_m, span / 70).map((m) => (
            <g key={m} class="grid">
              <path d={`M${x(m)},${TOP} V${bottom}`} />
              <text x={x(m)} y={bottom + 15} text-anchor="middle">
                {m}
              </text>
            </g>
          ))}
          <text x={width - RIGHT} y={bottom + 30} text-anchor="end">
            m from the charge inlet
          </text>
          <text x={LEFT - 6} y={TOP + 4} text-anchor="end">
            °C
          </text>
          {strings.map(({ id }, k) => (
            <g key={id} class="string" data-string={id}>
              <Profile id={id} k={k} profile={profile} x={x} y={y} />
              <FrontRow id={id} k={k} own={own} x={x} top={rows + k * ROW} />
            </g>
          ))}
        </svg>
      )}
    </div>
  );
}

type Scale = (value: number) => number;

function Profile({
  id,
  k,
  profile,
  x,
  y,
}: {
  id: string;
  k: number;
  profile: StoreProfile | null;
  x: Scale;
  y: Scale;
}) {
  const degrees = profile?.tubes.find((one) => one.id === id)?.temperature_degC;
  if (profile === null || degrees === undefined) return null;
  const points = profile.x_m.map((m, i) => `${x(m).toFixed(1)},${y(degrees[i]!).toFixed(1)}`);
  return (
    <>
      <polyline class="profile-line" points={points.join(' ')} stroke-dasharray={dashOf(k)} />
      {profile.readings
        .filter((one) => one.string === id && one.value_degC !== null && one.verdict === null)
        .map((one) => (
          <circle key={one.id} class="reading" cx={x(one.position_m)} cy={y(one.value_degC!)} r="2">
            <title>{`${one.id}: ${one.value_degC!.toFixed(1)} °C`}</title>
          </circle>
        ))}
    </>
  );
}

/** Name and line of the string, its front by the bed model with its width, and by the front view. */
function FrontRow({
  id,
  k,
  own,
  x,
  top,
}: {
  id: string;
  k: number;
  own: StoreState | null;
  x: Scale;
  top: number;
}) {
  const middle = top + ROW / 2;
  const string = own?.strings.find((one) => one.id === id);
  const view = own?.front_views.find((one) => one.id === id);
  const { position_m = null, width_m = null } = string ?? {};
  return (
    <>
      <path class="profile-line" d={`M4,${top + ROW - 5} h44`} stroke-dasharray={dashOf(k)} />
      <text class="string-name" x="4" y={middle + 1}>
        {id}
      </text>
      <path class="rail" d={`M${x(0)},${middle} H${x(1e9)}`} />
      {position_m !== null && width_m !== null && (
        <path
          class="width"
          d={`M${x(position_m - width_m)},${middle - 4} v8 m0,-4 H${x(position_m + width_m)} m0,-4 v8`}
        />
      )}
      {position_m !== null && <circle class="front" cx={x(position_m)} cy={middle} r="4" />}
      {view !== undefined && view.position_m !== null && (
        <FrontView
          at={view.position_m}
          half={2 * (view.position_sigma_m ?? 0)}
          seen={view.seen}
          x={x}
          y={middle + 6}
        />
      )}
    </>
  );
}

function FrontView({
  at,
  half,
  seen,
  x,
  y,
}: {
  at: number;
  half: number;
  seen: boolean;
  x: Scale;
  y: number;
}) {
  return (
    <g class="front-view" data-seen={seen ? '' : undefined}>
      <path d={`M${x(at - half)},${y} H${x(at + half)}`} />
      <path class="diamond" d={`M${x(at)},${y - 4} l4,4 l-4,4 l-4,-4 Z`} />
    </g>
  );
}
