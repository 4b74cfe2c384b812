import type { Frame, Scale } from './picture.js';

/** Marks and words at the left and below; `[value, label]`. */
export function Axes({
  frame,
  x,
  y,
  across,
  up,
  acrossName,
  upName,
}: {
  frame: Frame;
  x: Scale;
  y: Scale;
  across: readonly (readonly [number, string])[];
  up: readonly (readonly [number, string])[];
  acrossName?: string | undefined;
  upName?: string | undefined;
}) {
  const { left, top, width, height } = frame;
  const right = width - frame.right;
  const bottom = height - frame.bottom;
  return (
    <g class="axes">
      {up.map(([value, label]) => (
        <g key={value}>
          <line class="rule" x1={left} x2={right} y1={y(value)} y2={y(value)} />
          <text x={left - 6} y={y(value)} dy="0.35em" text-anchor="end">
            {label}
          </text>
        </g>
      ))}
      {across.map(([value, label]) => (
        <g key={value}>
          <line class="mark" x1={x(value)} x2={x(value)} y1={bottom} y2={bottom + 4} />
          <text x={x(value)} y={bottom + 17} text-anchor="middle">
            {label}
          </text>
        </g>
      ))}
      {upName !== undefined && (
        <text class="name" x={0} y={top - 12}>
          <Indexed text={upName} />
        </text>
      )}
      {acrossName !== undefined && (
        <text class="name" x={right} y={bottom + 33} text-anchor="end">
          <Indexed text={acrossName} />
        </text>
      )}
    </g>
  );
}

/** Words of a drawing; what stands after `_` in one is its index: `MWh_el`. */
export function Indexed({ text }: { text: string }) {
  const parts = text.split(/_(el|th)\b/);
  return (
    <>
      {parts.map((part, i) =>
        i % 2 === 0 ? (
          <tspan key={part} dy={i === 0 ? 0 : -INDEX_PX}>
            {part}
          </tspan>
        ) : (
          <tspan key={part} class="index" dx="0.5" dy={INDEX_PX}>
            {part}
          </tspan>
        ),
      )}
    </>
  );
}

/** An index stands so much lower [px]. */
const INDEX_PX = 3;

/** The hatch of what is missing; its lines take the colour of who uses it. */
export function Hatch({ id }: { id: string }) {
  return (
    <defs>
      <pattern
        id={id}
        width="6"
        height="6"
        patternUnits="userSpaceOnUse"
        patternTransform="rotate(45)"
      >
        <line class="hatch" x1="0" y1="0" x2="0" y2="6" />
      </pattern>
    </defs>
  );
}
