/**
 * The local history. Times are ms since 1970 of the source. `seq` numbers estimates, dispatch
 * answers, events and cycles together, in the order in which they were made: the forwarder's cursor.
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
  // Alarms with their states and every transition; what stood and was acknowledged before goes along.
  // A step is never changed, hence the state is written out here as it was then.
  `CREATE TABLE alarms (
     id TEXT PRIMARY KEY, unit TEXT NOT NULL, kind TEXT NOT NULL, state TEXT NOT NULL,
     until INTEGER, alarm TEXT NOT NULL, event TEXT) WITHOUT ROWID;
   CREATE INDEX alarms_by_unit ON alarms (unit, kind);
   CREATE INDEX alarms_by_until ON alarms (until) WHERE until IS NOT NULL;
   CREATE TABLE alarm_transitions (
     no INTEGER PRIMARY KEY, id TEXT NOT NULL, unit TEXT NOT NULL, kind TEXT NOT NULL,
     time INTEGER NOT NULL, what TEXT NOT NULL, before TEXT, after TEXT, who TEXT,
     why TEXT NOT NULL);
   CREATE INDEX alarm_transitions_by_time ON alarm_transitions (time);
   INSERT INTO alarms (id, unit, kind, state, until, alarm, event)
     SELECT id, unit, json_extract(json, '$.kind'), state, NULL,
       json_object('state', state,
         'active', json(iif(state = 'returned_unacknowledged', 'false', 'true')),
         'latched', json('false'), 'unseen', json('false'), 'suppressed', json('false'),
         'raised_ms', time, 'since_ms', coalesce(said, time),
         'acknowledged', iif(acknowledged_by IS NULL, NULL,
           json_object('who', acknowledged_by, 'why', '', 'since_ms', coalesce(said, time))),
         'shelf', NULL, 'service', NULL), json
     FROM (SELECT *,
       CAST(round((julianday(json_extract(json, '$.time')) - 2440587.5) * 86400000.0) AS INTEGER)
         AS time,
       (SELECT max(time) FROM acknowledgements WHERE acknowledgements.id = standing.id
         AND standing.state = 'acknowledged') AS said
       FROM standing);
   INSERT INTO alarm_transitions (id, unit, kind, time, what, before, after, who, why)
     SELECT id, unit, kind, time, what, NULL, after, who, '' FROM (
       SELECT id, unit, json_extract(json, '$.kind') AS kind, time, transition AS what,
         iif(transition = 'raised', 'unacknowledged', NULL) AS after, NULL AS who
       FROM events UNION ALL
       SELECT id, substr(id, 1, instr(id, '/') - 1),
         substr(rest, 1, instr(rest, '/') - 1), time, 'acknowledged', NULL, who
       FROM (SELECT *, substr(id, instr(id, '/') + 1) AS rest FROM acknowledgements))
     ORDER BY time;
   DROP TABLE standing;
   DROP TABLE acknowledgements;`,
  // Charges, stands and discharges once they are over (time: their end), and what indicators showed.
  `CREATE TABLE cycles (
     seq INTEGER PRIMARY KEY, unit TEXT NOT NULL, "from" INTEGER NOT NULL, time INTEGER NOT NULL,
     kind TEXT NOT NULL, no INTEGER NOT NULL, json TEXT NOT NULL, UNIQUE (unit, "from"));
   CREATE TABLE watch (
     unit TEXT NOT NULL, time INTEGER NOT NULL, content BLOB NOT NULL, PRIMARY KEY (unit, time));`,
  // What receivers outside are told, frozen as it is made; their cursors count on from where they were,
  // and what waited for one of them waits on. What stands counts as told: a return too many does no harm.
  `CREATE TABLE tellings (
     no INTEGER PRIMARY KEY AUTOINCREMENT, time INTEGER NOT NULL, json TEXT NOT NULL);
   CREATE INDEX tellings_by_time ON tellings (time);
   INSERT INTO sqlite_sequence (name, seq)
     SELECT 'tellings', coalesce(max(value), 0) FROM cursors WHERE name LIKE 'events to %';
   INSERT INTO tellings (no, time, json) SELECT seq, time, json FROM events
     WHERE seq > (SELECT min(value) FROM cursors WHERE name LIKE 'events to %') ORDER BY seq;
   UPDATE alarms SET alarm = json_set(alarm, '$.told', json(iif(alarm ->> '$.active', 'true', 'false')));`,
  // Series of estimates rolled up over stretches of time (time: their begin), and from when to when that
  // is done; what is older at this step is rolled up later, while the daemon runs.
  `CREATE TABLE rollup_10min (
     unit TEXT NOT NULL, time INTEGER NOT NULL, layout INTEGER NOT NULL, last INTEGER NOT NULL,
     content BLOB NOT NULL, PRIMARY KEY (unit, time, layout));
   CREATE TABLE rollup_2h (
     unit TEXT NOT NULL, time INTEGER NOT NULL, layout INTEGER NOT NULL, last INTEGER NOT NULL,
     content BLOB NOT NULL, PRIMARY KEY (unit, time, layout));
   CREATE TABLE rollup_1d (
     unit TEXT NOT NULL, time INTEGER NOT NULL, layout INTEGER NOT NULL, last INTEGER NOT NULL,
     content BLOB NOT NULL, PRIMARY KEY (unit, time, layout));
   CREATE TABLE rolled_up (
     unit TEXT PRIMARY KEY, "from" INTEGER NOT NULL, "to" INTEGER NOT NULL) WITHOUT ROWID;`,
  // States that late readings rewind to; which entries of the journal came late; what was made again and
  // what that changed; spans that the time-series database has to forget before it is given them anew.
  `CREATE TABLE rewind_points (
     unit TEXT NOT NULL, time INTEGER NOT NULL, journal_seq INTEGER NOT NULL,
     fingerprint TEXT NOT NULL, image BLOB NOT NULL, PRIMARY KEY (unit, time));
   CREATE TABLE late_readings (
     unit TEXT NOT NULL, time INTEGER NOT NULL, seq INTEGER NOT NULL, PRIMARY KEY (unit, time, seq))
     WITHOUT ROWID;
   CREATE INDEX late_readings_by_seq ON late_readings (unit, seq);
   CREATE TABLE rewinds (
     no INTEGER PRIMARY KEY AUTOINCREMENT, unit TEXT NOT NULL, "from" INTEGER NOT NULL,
     time INTEGER NOT NULL, json TEXT NOT NULL);
   CREATE INDEX rewinds_by_time ON rewinds (unit, time);
   CREATE TABLE withdrawals (
     seq INTEGER PRIMARY KEY, unit TEXT NOT NULL, time INTEGER NOT NULL, json TEXT NOT NULL);`,
];
