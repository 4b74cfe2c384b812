import type { UnitDefinition } from '../../core/definitions.js';
import type { Database } from './database.js';
import { seriesNames } from './series.js';

/** Which series the values of a row are, by the number that the row carries. */
export class Layouts {
  private readonly names = new Map<number, readonly string[]>();
  private readonly ofUnits = new Map<string, number>();

  constructor(private readonly database: Database) {
    const rows = database.prepare('SELECT no, names FROM layouts').all();
    for (const row of rows as { no: number; names: string }[]) {
      this.names.set(row.no, JSON.parse(row.names) as string[]);
    }
  }

  /** Names in the order of the values; none where the number is unknown. */
  of(no: number): readonly string[] {
    return this.names.get(no) ?? [];
  }

  /** Number of a unit's layout as it is configured, entered where it is new. */
  numberFor(unit: UnitDefinition): number {
    const known = this.ofUnits.get(unit.id);
    if (known !== undefined) return known;
    const names = JSON.stringify(seriesNames(unit));
    this.database.prepare('INSERT OR IGNORE INTO layouts (names) VALUES (?)').run(names);
    const no = this.database.prepare('SELECT no FROM layouts WHERE names = ?').pluck().get(names);
    this.names.set(no as number, JSON.parse(names) as string[]);
    this.ofUnits.set(unit.id, no as number);
    return no as number;
  }
}
