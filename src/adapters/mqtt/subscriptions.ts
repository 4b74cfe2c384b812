/** Filters of each client, also of one that is away; those of rockhour's own links are not counted. */
export class Subscriptions {
  private readonly filters = new Map<string, Set<string>>();
  private readonly own = new Set<string>();
  private total = 0;

  constructor(
    private readonly bounds: {
      /** Of one client, of all together, and characters of one filter. */
      readonly each_most: number;
      readonly all_most: number;
      readonly filter_most_characters: number;
    },
  ) {}

  get count(): number {
    return this.total;
  }

  of(id: string): number {
    return this.filters.get(id)?.size ?? 0;
  }

  has(id: string, filter: string): boolean {
    return this.filters.get(id)?.has(filter) ?? false;
  }

  /** Why a client may not subscribe to one more filter; null: it may. */
  refusal(id: string, filter: string): string | null {
    const { each_most, all_most, filter_most_characters } = this.bounds;
    if (filter.length > filter_most_characters) {
      return `a filter of ${filter.length} characters, more than ${filter_most_characters}`;
    }
    if (this.has(id, filter)) return null;
    if (this.of(id) >= each_most) return `it has ${each_most} already`;
    return this.total >= all_most ? `all clients have ${all_most} together` : null;
  }

  add(id: string, filter: string, isOwn: boolean): void {
    if (this.has(id, filter)) return;
    const filters = this.filters.get(id) ?? new Set();
    this.filters.set(id, filters.add(filter));
    if (isOwn) this.own.add(id);
    else this.total++;
  }

  remove(id: string, filters: readonly string[]): void {
    const known = this.filters.get(id);
    if (known === undefined) return;
    for (const filter of filters) {
      if (known.delete(filter) && !this.own.has(id)) this.total--;
    }
    if (known.size === 0) this.forget(id);
  }

  forget(id: string): void {
    if (!this.own.delete(id)) this.total -= this.of(id);
    this.filters.delete(id);
  }
}
