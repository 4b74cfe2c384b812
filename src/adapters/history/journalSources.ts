import type { Database } from './database.js';

interface Named {
  readonly unit: string;
  readonly channel: string;
}

/** Numbers that stand in the journal for channels of units, in their table. */
export class JournalSources {
  private readonly numbers = new Map<string, Map<string, number>>();
  private readonly names = new Map<number, Named>();
  private greatest = 0;

  constructor(private readonly database: Database) {
    const rows = database.prepare('SELECT no, unit, channel FROM sources').all();
    for (const row of rows as ({ no: number } & Named)[]) this.remember(row.no, row);
  }

  get count(): number {
    return this.names.size;
  }

  nameOf(no: number): Named {
    return this.names.get(no)!;
  }

  /** Within the transaction that uses it: a new one is entered. */
  numberOf(unit: string, channel: string): number {
    const known = this.numbers.get(unit)?.get(channel);
    if (known !== undefined) return known;
    const no = this.greatest + 1;
    this.database
      .prepare('INSERT INTO sources (no, unit, channel) VALUES (?, ?, ?)')
      .run(no, unit, channel);
    this.remember(no, { unit, channel });
    return no;
  }

  /** A transaction that failed took the sources it had named with it. */
  forgetBehind(count: number): void {
    for (const [no, { unit, channel }] of [...this.names].slice(count)) {
      this.names.delete(no);
      this.numbers.get(unit)?.delete(channel);
    }
    this.greatest = 0;
    for (const no of this.names.keys()) this.greatest = Math.max(this.greatest, no);
  }

  private remember(no: number, { unit, channel }: Named): void {
    const own = this.numbers.get(unit) ?? new Map<string, number>();
    this.numbers.set(unit, own);
    own.set(channel, no);
    this.names.set(no, { unit, channel });
    this.greatest = Math.max(this.greatest, no);
  }
}
