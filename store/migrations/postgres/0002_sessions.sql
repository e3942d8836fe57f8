-- Browsers that signed in. Operational, outside the proof.

CREATE TABLE sessions (
    hash   bytea PRIMARY KEY CHECK (length(hash) = 32),
    key_id text COLLATE "C" NOT NULL REFERENCES keys (id),
    until  text COLLATE "C" NOT NULL
);

CREATE INDEX sessions_until ON sessions (until);
