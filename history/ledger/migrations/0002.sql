-- Format 2: what people sign. Each table repeats what stands in the bodies of the
-- entries of that kind: a statement and its signature (history/approval).

CREATE TABLE anchor (
  entry            INTEGER NOT NULL REFERENCES entry (seq),
  place            INTEGER NOT NULL, -- of the statement in the entry
  folder           TEXT NOT NULL,
  revision         TEXT NOT NULL,    -- full commit hash
  content          TEXT NOT NULL,    -- hash of the folder's Git tree
  policy           TEXT NOT NULL,    -- SHA-256, see history/signoff
  role             TEXT NOT NULL,
  signer           TEXT NOT NULL,
  key              TEXT NOT NULL,    -- fingerprint
  time             TEXT NOT NULL,    -- as the signer states it
  statement_sha256 TEXT NOT NULL UNIQUE,
  PRIMARY KEY (entry, place)
) STRICT, WITHOUT ROWID;

CREATE TABLE sign_off (
  entry            INTEGER PRIMARY KEY REFERENCES entry (seq),
  assessment       INTEGER NOT NULL REFERENCES assessment (number),
  digest           TEXT NOT NULL,
  role             TEXT NOT NULL,
  decision         TEXT NOT NULL, -- approve, reject
  reason           TEXT NOT NULL,
  signer           TEXT NOT NULL,
  key              TEXT NOT NULL, -- fingerprint
  time             TEXT NOT NULL, -- as the signer states it
  statement_sha256 TEXT NOT NULL UNIQUE
) STRICT;

CREATE TABLE in_force (
  entry            INTEGER PRIMARY KEY REFERENCES entry (seq),
  folder           TEXT NOT NULL,
  revision         TEXT NOT NULL, -- full commit hash
  content          TEXT NOT NULL, -- hash of the folder's Git tree
  routes           TEXT NOT NULL, -- "all", or ids joined by ","
  since            TEXT NOT NULL,
  corrects         TEXT NOT NULL, -- nothing, "replaces ENTRY", "voids ENTRY"
  reason           TEXT NOT NULL,
  signer           TEXT NOT NULL,
  key              TEXT NOT NULL, -- fingerprint
  time             TEXT NOT NULL, -- as the signer states it
  statement_sha256 TEXT NOT NULL UNIQUE
) STRICT;

CREATE TABLE revocation (
  entry            INTEGER PRIMARY KEY REFERENCES entry (seq),
  revoked_key      TEXT NOT NULL, -- fingerprint
  role             TEXT NOT NULL, -- "owner", or a role of the policy
  reason           TEXT NOT NULL,
  signer           TEXT NOT NULL,
  key              TEXT NOT NULL, -- fingerprint of the signer's key
  time             TEXT NOT NULL, -- as the signer states it
  statement_sha256 TEXT NOT NULL UNIQUE
) STRICT;

CREATE TRIGGER anchor_update BEFORE UPDATE ON anchor BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER anchor_delete BEFORE DELETE ON anchor BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER anchor_insert BEFORE INSERT ON anchor WHEN EXISTS (SELECT 1 FROM anchor WHERE entry = NEW.entry AND place = NEW.place OR statement_sha256 = NEW.statement_sha256) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER sign_off_update BEFORE UPDATE ON sign_off BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER sign_off_delete BEFORE DELETE ON sign_off BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER sign_off_insert BEFORE INSERT ON sign_off WHEN EXISTS (SELECT 1 FROM sign_off WHERE entry = NEW.entry OR statement_sha256 = NEW.statement_sha256) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER in_force_update BEFORE UPDATE ON in_force BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER in_force_delete BEFORE DELETE ON in_force BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER in_force_insert BEFORE INSERT ON in_force WHEN EXISTS (SELECT 1 FROM in_force WHERE entry = NEW.entry OR statement_sha256 = NEW.statement_sha256) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER revocation_update BEFORE UPDATE ON revocation BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER revocation_delete BEFORE DELETE ON revocation BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
CREATE TRIGGER revocation_insert BEFORE INSERT ON revocation WHEN EXISTS (SELECT 1 FROM revocation WHERE entry = NEW.entry OR statement_sha256 = NEW.statement_sha256) BEGIN SELECT RAISE(ABORT, 'the ledger is append only'); END;
