-- The ledger. Tables that are only added to refuse UPDATE, DELETE and TRUNCATE
-- by triggers that also fire for replicas.
--
-- Whoever owns the tables can take the triggers off: a server is best run as a
-- role that owns nothing, with the rights that the program's migrate command
-- grants.
--
-- All text compares by bytes, whatever the locale of the database. There are no
-- foreign keys: each would cost a look-up a row, and what refers to an entry is
-- written with it, in one batch that was checked.

CREATE TABLE identity (
    one          int PRIMARY KEY CHECK (one = 1),
    origin       text COLLATE "C" NOT NULL,
    verifier_key text COLLATE "C" NOT NULL
);

-- The one row that is compared and swapped by every append.
CREATE TABLE head (
    one        int PRIMARY KEY CHECK (one = 1),
    size       bigint NOT NULL CHECK (size >= 0),
    root       bytea NOT NULL CHECK (length(root) = 32),
    checkpoint text COLLATE "C" NOT NULL
);

-- SHA-256 of nothing: the root of the empty tree.
INSERT INTO head (one, size, root, checkpoint)
VALUES (1, 0, '\xe3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855', '');

CREATE TABLE entries (
    idx             bigint PRIMARY KEY CHECK (idx >= 0),
    id              text COLLATE "C" NOT NULL UNIQUE,
    type            text COLLATE "C" NOT NULL,
    at              text COLLATE "C" NOT NULL,
    author          text COLLATE "C" NOT NULL,
    leaf            bytea NOT NULL CHECK (length(leaf) = 32),
    part            text COLLATE "C" NOT NULL,
    revision        text COLLATE "C" NOT NULL,
    joint           text COLLATE "C" NOT NULL,
    aspect          text COLLATE "C" NOT NULL,
    geometry_digest text COLLATE "C" NOT NULL,
    kind            text COLLATE "C" NOT NULL,
    verdict         text COLLATE "C" NOT NULL,
    margin          double precision,
    target          text COLLATE "C" NOT NULL,
    role            text COLLATE "C" NOT NULL,
    bytes           bytea NOT NULL
);

-- A quicker compression, where the server was built with it.
DO $$ BEGIN
    ALTER TABLE entries ALTER COLUMN bytes SET COMPRESSION lz4;
EXCEPTION WHEN feature_not_supported THEN
    NULL;
END $$;

CREATE INDEX entries_subject    ON entries (part, revision, joint, aspect, kind, idx) WHERE type = 'record';
CREATE INDEX entries_part       ON entries (part, idx, revision, joint, kind, verdict) WHERE type = 'record'; -- the rest for looking without the row
CREATE INDEX entries_joint      ON entries (joint, idx) WHERE type = 'record';
CREATE INDEX entries_author     ON entries (author, idx) WHERE type = 'record';
CREATE INDEX entries_verdict    ON entries (verdict, idx) WHERE type = 'record';
CREATE INDEX entries_kind       ON entries (kind, idx) WHERE type = 'record';
CREATE INDEX entries_at         ON entries (at) WHERE type = 'record';
CREATE INDEX entries_curve_sets ON entries (idx) WHERE type = 'curve-set';
CREATE INDEX entries_target     ON entries (target, idx) WHERE target <> '';

-- What records rest on, and the names of curve sets. A value is bytea: the name of a material may be any
-- text, also with characters that text refuses.
CREATE TABLE terms (
    idx   bigint NOT NULL,
    place int NOT NULL,
    kind  text COLLATE "C" NOT NULL,
    value bytea NOT NULL,
    PRIMARY KEY (idx, place)
);

CREATE INDEX terms_value ON terms (kind, value, idx);

CREATE TABLE tree_hashes (
    idx  bigint PRIMARY KEY CHECK (idx >= 0),
    hash bytea NOT NULL CHECK (length(hash) = 32)
);

-- A path is bytea: it comes from a request, decoded.
CREATE TABLE idempotency (
    caller         text COLLATE "C" NOT NULL,
    method         text COLLATE "C" NOT NULL,
    path           bytea NOT NULL,
    key            text COLLATE "C" NOT NULL,
    request_digest bytea NOT NULL CHECK (length(request_digest) = 32),
    idx            bigint NOT NULL,
    state          text COLLATE "C" NOT NULL,
    PRIMARY KEY (caller, method, path, key)
);

-- From here on: operational, outside the proof.

CREATE TABLE keys (
    seq       bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY,
    id        text COLLATE "C" NOT NULL UNIQUE,
    caller    text COLLATE "C" NOT NULL,
    role      text COLLATE "C" NOT NULL,
    hash      bytea NOT NULL UNIQUE CHECK (length(hash) = 32),
    added     text COLLATE "C" NOT NULL,
    revoked   text COLLATE "C" NOT NULL,
    last_used text COLLATE "C" NOT NULL
);

-- An index over what the entries say of each record now, kept so that lists by
-- state and of the latest are quick. It only finds records: the state that is
-- told is derived from the entries, a list whose records do not have the state
-- that they were found by is refused, and a release does not look here.
CREATE TABLE standing (
    idx    bigint PRIMARY KEY,
    state  text COLLATE "C" NOT NULL,
    latest boolean NOT NULL
);

CREATE INDEX standing_state  ON standing (state, idx);
CREATE INDEX standing_latest ON standing (idx) WHERE latest;

CREATE FUNCTION refuse_change() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
    RAISE EXCEPTION '% is only added to', TG_TABLE_NAME USING ERRCODE = 'restrict_violation';
END $$;

CREATE FUNCTION refuse_shrinking() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
    IF NEW.size <= OLD.size THEN
        RAISE EXCEPTION 'head only grows' USING ERRCODE = 'restrict_violation';
    END IF;
    RETURN NEW;
END $$;

-- A batch is sent whole, in one transaction: what must hold is checked here, and
-- an error undoes the batch. LD001: the head has moved. LD002: there is no such
-- standing key.
CREATE FUNCTION swap_head(base_size bigint, base_root bytea, new_size bigint, new_root bytea, new_checkpoint text) RETURNS void LANGUAGE plpgsql AS $$
BEGIN
    UPDATE head SET size = new_size, root = new_root, checkpoint = new_checkpoint WHERE size = base_size AND root = base_root;
    IF NOT FOUND THEN
        RAISE EXCEPTION 'the head is not of % entries any more', base_size USING ERRCODE = 'LD001';
    END IF;
END $$;

CREATE FUNCTION revoke_key(key_id text, revoked_at text) RETURNS void LANGUAGE plpgsql AS $$
BEGIN
    UPDATE keys SET revoked = revoked_at WHERE id = key_id AND revoked = '';
    IF NOT FOUND THEN
        RAISE EXCEPTION 'there is no standing key % to revoke', key_id USING ERRCODE = 'LD002';
    END IF;
END $$;

CREATE TRIGGER identity_change    BEFORE UPDATE OR DELETE OR TRUNCATE ON identity    EXECUTE FUNCTION refuse_change();
CREATE TRIGGER head_delete        BEFORE DELETE OR TRUNCATE           ON head        EXECUTE FUNCTION refuse_change();
CREATE TRIGGER head_update        BEFORE UPDATE ON head FOR EACH ROW                 EXECUTE FUNCTION refuse_shrinking();
CREATE TRIGGER entries_change     BEFORE UPDATE OR DELETE OR TRUNCATE ON entries     EXECUTE FUNCTION refuse_change();
CREATE TRIGGER terms_change       BEFORE UPDATE OR DELETE OR TRUNCATE ON terms       EXECUTE FUNCTION refuse_change();
CREATE TRIGGER tree_hashes_change BEFORE UPDATE OR DELETE OR TRUNCATE ON tree_hashes EXECUTE FUNCTION refuse_change();
CREATE TRIGGER idempotency_change BEFORE UPDATE OR DELETE OR TRUNCATE ON idempotency EXECUTE FUNCTION refuse_change();
CREATE TRIGGER keys_delete        BEFORE DELETE OR TRUNCATE           ON keys        EXECUTE FUNCTION refuse_change();

ALTER TABLE identity    ENABLE ALWAYS TRIGGER identity_change;
ALTER TABLE head        ENABLE ALWAYS TRIGGER head_delete;
ALTER TABLE head        ENABLE ALWAYS TRIGGER head_update;
ALTER TABLE entries     ENABLE ALWAYS TRIGGER entries_change;
ALTER TABLE terms       ENABLE ALWAYS TRIGGER terms_change;
ALTER TABLE tree_hashes ENABLE ALWAYS TRIGGER tree_hashes_change;
ALTER TABLE idempotency ENABLE ALWAYS TRIGGER idempotency_change;
ALTER TABLE keys        ENABLE ALWAYS TRIGGER keys_delete;
