/** Sheet. */
export function SiteSheet() {
  return <h1>All units</h1>;
}
