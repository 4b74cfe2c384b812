/** Of a source that is off by about whole hours; positive: ahead. */
export function zoneWords(hours: number): string {
  const whole = Math.round(hours);
  const side = whole > 0 ? 'ahead' : 'behind';
  return `stamped ${Math.abs(whole)} h ${side}, which looks like another time zone`;
}
