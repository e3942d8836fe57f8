-- Notices on their way to other systems: written with the entry that they are
-- about, taken out by delivery. Operational, outside the proof.

CREATE TABLE notices (
    seq      INTEGER PRIMARY KEY,
    id       TEXT NOT NULL,
    target   TEXT NOT NULL,
    body     BLOB NOT NULL,
    attempts INTEGER NOT NULL,
    due      TEXT NOT NULL,
    sent     TEXT NOT NULL,
    UNIQUE (id, target)
) STRICT;

CREATE INDEX notices_due ON notices (due) WHERE sent = '';
