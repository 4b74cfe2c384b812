/** Sheet. */
export function TraderSheet() {
  return <h1>Offer</h1>;
}
