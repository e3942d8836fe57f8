-- The ledger. Tables that are only added to refuse UPDATE and DELETE by
-- trigger. INSERT OR REPLACE goes past DELETE triggers, so that every row is
-- also refused on insertion where its key exists or, for a numbered table, is
-- not the next. There are no foreign keys: what refers to an entry is written
-- with it, in one batch that was checked.

CREATE TABLE identity (
    one          INTEGER PRIMARY KEY CHECK (one = 1),
    origin       TEXT NOT NULL,
    verifier_key TEXT NOT NULL
) STRICT;

-- The one row that is compared and swapped by every append.
CREATE TABLE head (
    one        INTEGER PRIMARY KEY CHECK (one = 1),
    size       INTEGER NOT NULL CHECK (size >= 0),
    root       BLOB NOT NULL CHECK (length(root) = 32),
    checkpoint TEXT NOT NULL
) STRICT;

-- SHA-256 of nothing: the root of the empty tree.
INSERT INTO head (one, size, root, checkpoint)
VALUES (1, 0, x'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855', '');

-- The bytes stand last: a list reads the columns before them without them.
CREATE TABLE entries (
    idx             INTEGER PRIMARY KEY,
    id              TEXT NOT NULL UNIQUE,
    type            TEXT NOT NULL,
    at              TEXT NOT NULL,
    author          TEXT NOT NULL,
    leaf            BLOB NOT NULL CHECK (length(leaf) = 32),
    part            TEXT NOT NULL,
    revision        TEXT NOT NULL,
    joint           TEXT NOT NULL,
    aspect          TEXT NOT NULL,
    geometry_digest TEXT NOT NULL,
    kind            TEXT NOT NULL,
    verdict         TEXT NOT NULL,
    margin          REAL,
    target          TEXT NOT NULL,
    role            TEXT NOT NULL,
    bytes           BLOB NOT NULL
) STRICT;

CREATE INDEX entries_subject    ON entries (part, revision, joint, aspect, kind, idx) WHERE type = 'record';
CREATE INDEX entries_part       ON entries (part, idx, revision, joint, kind, verdict) WHERE type = 'record'; -- the rest for looking without the row
CREATE INDEX entries_joint      ON entries (joint, idx) WHERE type = 'record';
CREATE INDEX entries_author     ON entries (author, idx) WHERE type = 'record';
CREATE INDEX entries_verdict    ON entries (verdict, idx) WHERE type = 'record';
CREATE INDEX entries_kind       ON entries (kind, idx) WHERE type = 'record';
CREATE INDEX entries_at         ON entries (at) WHERE type = 'record';
CREATE INDEX entries_curve_sets ON entries (idx) WHERE type = 'curve-set';
CREATE INDEX entries_target     ON entries (target, idx) WHERE target <> '';

-- What records rest on, and the names of curve sets. A value is a BLOB: the name of a material may be any
-- text.
CREATE TABLE terms (
    idx   INTEGER NOT NULL,
    place INTEGER NOT NULL,
    kind  TEXT NOT NULL,
    value BLOB NOT NULL,
    PRIMARY KEY (idx, place)
) STRICT, WITHOUT ROWID;

CREATE INDEX terms_value ON terms (kind, value, idx);

CREATE TABLE tree_hashes (
    idx  INTEGER PRIMARY KEY,
    hash BLOB NOT NULL CHECK (length(hash) = 32)
) STRICT;

-- A path is a BLOB: it comes from a request, decoded.
CREATE TABLE idempotency (
    caller         TEXT NOT NULL,
    method         TEXT NOT NULL,
    path           BLOB NOT NULL,
    key            TEXT NOT NULL,
    request_digest BLOB NOT NULL CHECK (length(request_digest) = 32),
    idx            INTEGER NOT NULL,
    state          TEXT NOT NULL,
    PRIMARY KEY (caller, method, path, key)
) STRICT, WITHOUT ROWID;

-- From here on: operational, outside the proof.

CREATE TABLE keys (
    seq       INTEGER PRIMARY KEY,
    id        TEXT NOT NULL UNIQUE,
    caller    TEXT NOT NULL,
    role      TEXT NOT NULL,
    hash      BLOB NOT NULL UNIQUE CHECK (length(hash) = 32),
    added     TEXT NOT NULL,
    revoked   TEXT NOT NULL,
    last_used TEXT NOT NULL
) STRICT;

-- An index over what the entries say of each record now, kept so that lists by
-- state and of the latest are quick. It only finds records: the state that is
-- told is derived from the entries, a list whose records do not have the state
-- that they were found by is refused, and a release does not look here.
CREATE TABLE standing (
    idx    INTEGER PRIMARY KEY,
    state  TEXT NOT NULL,
    latest INTEGER NOT NULL CHECK (latest IN (0, 1))
) STRICT;

CREATE INDEX standing_state  ON standing (state, idx);
CREATE INDEX standing_latest ON standing (idx) WHERE latest = 1;

CREATE TRIGGER identity_insert BEFORE INSERT ON identity WHEN EXISTS (SELECT 1 FROM identity)
BEGIN SELECT RAISE(ABORT, 'identity is written once'); END;
CREATE TRIGGER identity_update BEFORE UPDATE ON identity
BEGIN SELECT RAISE(ABORT, 'identity is written once'); END;
CREATE TRIGGER identity_delete BEFORE DELETE ON identity
BEGIN SELECT RAISE(ABORT, 'identity is written once'); END;

CREATE TRIGGER head_insert BEFORE INSERT ON head
BEGIN SELECT RAISE(ABORT, 'head has one row'); END;
CREATE TRIGGER head_update BEFORE UPDATE ON head WHEN NEW.size <= OLD.size
BEGIN SELECT RAISE(ABORT, 'head only grows'); END;
CREATE TRIGGER head_delete BEFORE DELETE ON head
BEGIN SELECT RAISE(ABORT, 'head has one row'); END;

CREATE TRIGGER entries_insert BEFORE INSERT ON entries
WHEN NEW.idx IS NOT (SELECT coalesce(max(idx) + 1, 0) FROM entries) OR EXISTS (SELECT 1 FROM entries WHERE id = NEW.id)
BEGIN SELECT RAISE(ABORT, 'entries is only added to, at its end'); END;
CREATE TRIGGER entries_update BEFORE UPDATE ON entries
BEGIN SELECT RAISE(ABORT, 'entries is only added to'); END;
CREATE TRIGGER entries_delete BEFORE DELETE ON entries
BEGIN SELECT RAISE(ABORT, 'entries is only added to'); END;

CREATE TRIGGER terms_insert BEFORE INSERT ON terms
WHEN EXISTS (SELECT 1 FROM terms WHERE idx = NEW.idx AND place = NEW.place)
BEGIN SELECT RAISE(ABORT, 'terms is only added to'); END;
CREATE TRIGGER terms_update BEFORE UPDATE ON terms
BEGIN SELECT RAISE(ABORT, 'terms is only added to'); END;
CREATE TRIGGER terms_delete BEFORE DELETE ON terms
BEGIN SELECT RAISE(ABORT, 'terms is only added to'); END;

CREATE TRIGGER tree_hashes_insert BEFORE INSERT ON tree_hashes
WHEN NEW.idx IS NOT (SELECT coalesce(max(idx) + 1, 0) FROM tree_hashes)
BEGIN SELECT RAISE(ABORT, 'tree_hashes is only added to, at its end'); END;
CREATE TRIGGER tree_hashes_update BEFORE UPDATE ON tree_hashes
BEGIN SELECT RAISE(ABORT, 'tree_hashes is only added to'); END;
CREATE TRIGGER tree_hashes_delete BEFORE DELETE ON tree_hashes
BEGIN SELECT RAISE(ABORT, 'tree_hashes is only added to'); END;

CREATE TRIGGER idempotency_insert BEFORE INSERT ON idempotency
WHEN EXISTS (SELECT 1 FROM idempotency WHERE caller = NEW.caller AND method = NEW.method AND path = NEW.path AND key = NEW.key)
BEGIN SELECT RAISE(ABORT, 'idempotency is only added to'); END;
CREATE TRIGGER idempotency_update BEFORE UPDATE ON idempotency
BEGIN SELECT RAISE(ABORT, 'idempotency is only added to'); END;
CREATE TRIGGER idempotency_delete BEFORE DELETE ON idempotency
BEGIN SELECT RAISE(ABORT, 'idempotency is only added to'); END;

CREATE TRIGGER keys_insert BEFORE INSERT ON keys
WHEN EXISTS (SELECT 1 FROM keys WHERE seq = NEW.seq OR id = NEW.id OR hash = NEW.hash)
BEGIN SELECT RAISE(ABORT, 'a key is added once'); END;
CREATE TRIGGER keys_delete BEFORE DELETE ON keys
BEGIN SELECT RAISE(ABORT, 'a key is revoked, not deleted'); END;
