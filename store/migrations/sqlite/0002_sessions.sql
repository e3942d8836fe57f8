-- Browsers that signed in. Operational, outside the proof.

CREATE TABLE sessions (
    hash   BLOB NOT NULL PRIMARY KEY CHECK (length(hash) = 32),
    key_id TEXT NOT NULL REFERENCES keys (id),
    until  TEXT NOT NULL
) STRICT, WITHOUT ROWID;

CREATE INDEX sessions_until ON sessions (until);
