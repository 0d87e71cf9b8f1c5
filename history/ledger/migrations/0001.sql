-- Ledger of speedtrail, format 1. Append only: rows are added, never altered or
-- deleted. The entries are the record; all other tables repeat what stands in
-- their bodies, for anyone with SQL.

CREATE TABLE entry (
  seq      INTEGER PRIMARY KEY CHECK (seq >= 1), -- 1, 2, 3, ...
  time     TEXT NOT NULL,                        -- of recording, YYYY-MM-DDTHH:MM:SSZ; a claim
  kind     TEXT NOT NULL,                        -- ledger, assessment
  body     BLOB NOT NULL,                        -- RFC 8785 JSON
  previous TEXT NOT NULL UNIQUE,                 -- hash of the entry before, 64 zeros for the first
  hash     TEXT NOT NULL UNIQUE                  -- SHA-256, see the package comment of history/chain
) STRICT;

CREATE TABLE assessment (
  number        INTEGER PRIMARY KEY CHECK (number >= 1),
  entry         INTEGER NOT NULL UNIQUE REFERENCES entry (seq),
  digest        TEXT NOT NULL UNIQUE, -- SHA-256 of what was computed and from what
  base          TEXT NOT NULL,        -- full commit hash
  target        TEXT NOT NULL,        -- full commit hash
  folder        TEXT NOT NULL,        -- the data set's folder in the repository, "." for its root
  dataset       TEXT NOT NULL,        -- name of the data set
  rules_version INTEGER NOT NULL,
  speed_changes INTEGER NOT NULL,     -- rows in speed_change
  findings      INTEGER NOT NULL      -- rows in finding
) STRICT;

CREATE TABLE request (
  assessment INTEGER NOT NULL REFERENCES assessment (number),
  place      INTEGER NOT NULL,
  id         TEXT NOT NULL, -- of a change request in play
  title      TEXT NOT NULL,
  PRIMARY KEY (assessment, place)
) STRICT, WITHOUT ROWID;

CREATE TABLE preparer (
  assessment INTEGER NOT NULL REFERENCES assessment (number),
  place      INTEGER NOT NULL,
  name       TEXT NOT NULL,
  email      TEXT NOT NULL,
  PRIMARY KEY (assessment, place)
) STRICT, WITHOUT ROWID;

CREATE TABLE speed_change (
  assessment    INTEGER NOT NULL REFERENCES assessment (number),
  place         INTEGER NOT NULL, -- 1, 2, ... by route, direction, position, train
  route         TEXT NOT NULL,
  direction     TEXT NOT NULL,    -- nominal, reverse
  train         TEXT NOT NULL,
  from_km       TEXT NOT NULL,    -- as on the posts, # where they repeat
  to_km         TEXT NOT NULL,
  length_mm     INTEGER NOT NULL, -- running distance
  before_kmh    INTEGER NOT NULL,
  after_kmh     INTEGER NOT NULL,
  run_out       INTEGER NOT NULL CHECK (run_out IN (0, 1)),
  before_source TEXT NOT NULL,    -- "path:line kind value", joined by "; "
  after_source  TEXT NOT NULL,
  PRIMARY KEY (assessment, place)
) STRICT, WITHOUT ROWID;

CREATE TABLE finding (
  assessment INTEGER NOT NULL REFERENCES assessment (number),
  place      INTEGER NOT NULL,
  id         TEXT NOT NULL,
  route      TEXT NOT NULL,
  direction  TEXT NOT NULL,
  from_km    TEXT NOT NULL,
  to_km      TEXT NOT NULL,
  text       TEXT NOT NULL,
  accepted   TEXT NOT NULL, -- reason of the acceptance, empty for none
  PRIMARY KEY (assessment, place)
) STRICT, WITHOUT ROWID;

-- Against accidents, not against administrators. REPLACE would delete a row
-- without telling a DELETE trigger, so that an existing key is refused as well.
CREATE TRIGGER entry_update BEFORE UPDATE ON entry BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER entry_delete BEFORE DELETE ON entry BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER entry_insert BEFORE INSERT ON entry WHEN EXISTS (SELECT 1 FROM entry WHERE seq = NEW.seq OR hash = NEW.hash OR previous = NEW.previous) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER assessment_update BEFORE UPDATE ON assessment BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER assessment_delete BEFORE DELETE ON assessment BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER assessment_insert BEFORE INSERT ON assessment WHEN EXISTS (SELECT 1 FROM assessment WHERE number = NEW.number OR entry = NEW.entry OR digest = NEW.digest) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER request_update BEFORE UPDATE ON request BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER request_delete BEFORE DELETE ON request BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER request_insert BEFORE INSERT ON request WHEN EXISTS (SELECT 1 FROM request WHERE assessment = NEW.assessment AND place = NEW.place) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER preparer_update BEFORE UPDATE ON preparer BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER preparer_delete BEFORE DELETE ON preparer BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER preparer_insert BEFORE INSERT ON preparer WHEN EXISTS (SELECT 1 FROM preparer WHERE assessment = NEW.assessment AND place = NEW.place) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER speed_change_update BEFORE UPDATE ON speed_change BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER speed_change_delete BEFORE DELETE ON speed_change BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER speed_change_insert BEFORE INSERT ON speed_change WHEN EXISTS (SELECT 1 FROM speed_change WHERE assessment = NEW.assessment AND place = NEW.place) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER finding_update BEFORE UPDATE ON finding BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER finding_delete BEFORE DELETE ON finding BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER finding_insert BEFORE INSERT ON finding WHEN EXISTS (SELECT 1 FROM finding WHERE assessment = NEW.assessment AND place = NEW.place) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
