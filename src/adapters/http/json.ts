/**
 * JSON of the answers. JSON.stringify writes NaN and Infinity as null without a word; here they
 * still become null, since a page with one blank figure serves better than none, but each is
 * counted, and the count stands in /api/counters and /metrics.
 */
export class JsonWriter {
  nonFinite = 0;

  readonly write = (value: unknown): string => JSON.stringify(value, this.replace);

  private readonly replace = (_key: string, value: unknown): unknown => {
    if (typeof value !== 'number' || Number.isFinite(value)) return value;
    this.nonFinite += 1;
    return null;
  };
}
