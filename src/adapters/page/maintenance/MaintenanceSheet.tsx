/** Sheet. */
export function MaintenanceSheet() {
  return <h1>Rock</h1>;
}
