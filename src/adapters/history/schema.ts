/**
 * The local history. Times are ms since 1970 of the source. `seq` numbers estimates, dispatch
 * answers and events together, in the order in which they were made: the forwarder's cursor.
 */
export const HISTORY_SCHEMA = [
  `CREATE TABLE layouts (no INTEGER PRIMARY KEY, names TEXT NOT NULL UNIQUE);
   CREATE TABLE estimates (
     seq INTEGER PRIMARY KEY, unit TEXT NOT NULL, time INTEGER NOT NULL,
     json TEXT NOT NULL, layout INTEGER NOT NULL, series BLOB NOT NULL, UNIQUE (unit, time));
   CREATE TABLE dispatch (
     seq INTEGER PRIMARY KEY, unit TEXT NOT NULL, time INTEGER NOT NULL,
     json TEXT NOT NULL, UNIQUE (unit, time));
   CREATE TABLE events (
     seq INTEGER PRIMARY KEY, unit TEXT NOT NULL, id TEXT NOT NULL, time INTEGER NOT NULL,
     transition TEXT NOT NULL, json TEXT NOT NULL, UNIQUE (id, time, transition));
   CREATE INDEX events_by_time ON events (time);
   CREATE TABLE standing (
     id TEXT PRIMARY KEY, unit TEXT NOT NULL, state TEXT NOT NULL, acknowledged_by TEXT,
     json TEXT NOT NULL) WITHOUT ROWID;
   CREATE TABLE acknowledgements (
     no INTEGER PRIMARY KEY, id TEXT NOT NULL, who TEXT NOT NULL, time INTEGER NOT NULL);
   CREATE TABLE profiles (
     unit TEXT NOT NULL, time INTEGER NOT NULL, json TEXT NOT NULL, PRIMARY KEY (unit, time))
     WITHOUT ROWID;
   CREATE TABLE checkpoints (
     unit TEXT NOT NULL, time INTEGER NOT NULL, journal_seq INTEGER NOT NULL,
     fingerprint TEXT NOT NULL, image BLOB NOT NULL, PRIMARY KEY (unit, time));
   CREATE TABLE cursors (name TEXT PRIMARY KEY, value INTEGER NOT NULL) WITHOUT ROWID;`,
  // Offers as they were answered: what was sold on their strength is never rewritten.
  `CREATE TABLE offers (
     no INTEGER PRIMARY KEY AUTOINCREMENT, unit TEXT NOT NULL, asked INTEGER NOT NULL,
     time INTEGER NOT NULL, summary TEXT NOT NULL, content BLOB NOT NULL);
   CREATE INDEX offers_by_unit ON offers (unit, asked);
   CREATE TRIGGER offers_stay BEFORE UPDATE ON offers
     BEGIN SELECT RAISE(ABORT, 'offers are never rewritten'); END;`,
];
