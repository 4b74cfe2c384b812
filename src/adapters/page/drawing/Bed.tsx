import { useLayoutEffect, useRef } from 'preact/hooks';
import type { Mode } from '../../../core/definitions.js';
import { s, setAttributes } from '../lib/dom.js';
import { REASON_WORDS } from '../lib/format.js';
import type { StoreDefinition, StoreProfile, StoreState } from '../lib/wire.js';
import { type Frame, frameOf, type Ring, ringsOf, type Space } from './frame.js';
import { frontMarks, frontWords, travelOf } from './front.js';
import { profileLines, shownOf, temperatureScale } from './profile.js';
import { Rubble } from './rubble.js';
import { gasArrows, strings, tubeFronts, vessel } from './section.js';

/** What of a store's state is drawn: the present one, or one of its past. */
export type DrawnStore = Pick<StoreState, 'fronts' | 'fronts_reason' | 'strings'>;

/** A bed and its temperatures at one time. */
export interface Drawn {
  readonly mode: Mode | null;
  readonly own: DrawnStore | null;
  readonly profile: StoreProfile | null;
}

/** The profile of all strings together. */
export const MEAN = '';

/** Where the fronts are, in words; needs no layout. */
export function bedWords(store: StoreDefinition, { mode, own }: Drawn): string {
  const travel = travelOf(store.charge_inlet_at === 'top' ? 1 : -1, mode);
  const fronts = own?.fronts ?? [];
  if (fronts.length > 0) {
    return fronts.map((front) => frontWords(front, travel)).join('; ');
  }
  return own?.fronts_reason ? REASON_WORDS[own.fronts_reason] : 'no estimate yet';
}

/** The parts of a drawing that stay for a space, and those that move. */
class BedDrawing {
  private readonly frame: Frame;
  private readonly rings: Ring[];
  private readonly rubble: Rubble;
  private readonly moving = s('g');
  private readonly above = s('g');

  constructor(
    svg: SVGSVGElement,
    private readonly store: StoreDefinition,
    all: readonly StoreDefinition[],
    space: Space,
  ) {
    this.frame = frameOf(store, all, space);
    this.rings = ringsOf(store);
    const { reference_hot_degC: hot, reference_cold_degC: cold, kind } = store;
    this.rubble = new Rubble(this.frame, this.rings, (degrees) => {
      const theta = (degrees - cold) / (hot - cold);
      return kind === 'hot' ? theta : 1 - theta;
    });
    const { width, height } = this.frame;
    setAttributes(svg, { width, height, viewBox: `0 0 ${width} ${height}` });
    svg.replaceChildren(
      this.rubble.element,
      vessel(this.frame, store),
      temperatureScale(this.frame, store),
      this.moving,
      this.above,
    );
  }

  update({ mode, own, profile }: Drawn, chosen: string): void {
    const { frame, rings } = this;
    this.rubble.update(profile);
    this.moving.replaceChildren(
      gasArrows(frame, mode),
      tubeFronts(frame, rings, own, this.store.length_m),
      strings(frame, rings, profile?.readings ?? []),
    );
    const fronts = own?.fronts ?? [];
    this.above.replaceChildren(...fronts.map((front) => frontMarks(frame, front, mode, profile)));
    if (profile !== null) {
      const shown = shownOf(profile, this.store, chosen);
      this.above.prepend(profileLines(frame, profile, shown, chosen));
    }
  }
}

/**
 * A bed in half section to scale, and beside it the temperature along the same heights: readings as
 * points, the estimate with its band, the front with its width and which way it moves.
 *
 * @param all stores of the unit, which share one scale
 * @param chosen string whose profile is drawn, or MEAN
 */
export function Bed({
  store,
  all,
  space,
  drawn,
  chosen,
}: {
  store: StoreDefinition;
  all: readonly StoreDefinition[];
  space: Space;
  drawn: Drawn;
  chosen: string;
}) {
  const svg = useRef<SVGSVGElement>(null);
  const drawing = useRef<BedDrawing | null>(null);
  const { width, bedHeight, beside } = space;
  useLayoutEffect(() => {
    if (svg.current === null || width === 0) return;
    drawing.current = new BedDrawing(svg.current, store, all, { width, bedHeight, beside });
  }, [store, all, width, bedHeight, beside]);
  // Only what moves the drawing: ages and beats of other units draw nothing here.
  const { mode, own, profile } = drawn;
  useLayoutEffect(
    () => drawing.current?.update({ mode, own, profile }, chosen),
    [store, all, width, bedHeight, beside, mode, own, profile, chosen],
  );
  return (
    <svg
      ref={svg}
      class="bed"
      role="img"
      aria-label={`Bed and temperatures of store ${store.id}: ${bedWords(store, drawn)}`}
    />
  );
}
