/** A bed lying on its side, charged as far as it is full. Solid: what can be delivered is electric. */
export function ChargeBar({ charge }: { charge: number | null }) {
  const width = Math.round(1000 * Math.min(1, Math.max(0, charge ?? 0))) / 10;
  return (
    <svg class="charge-bar" viewBox="0 0 100 10" preserveAspectRatio="none" aria-hidden="true">
      <rect class="spent" x="0" y="0" width="100" height="10" />
      <rect class="charged" x="0" y="0" width={width} height="10" />
      <rect class="wall" x="0" y="0" width="100" height="10" />
    </svg>
  );
}
