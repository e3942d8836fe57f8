-- Notices on their way to other systems: written with the entry that they are
-- about, taken out by delivery. Operational, outside the proof.

CREATE TABLE notices (
    seq      bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY,
    id       text COLLATE "C" NOT NULL,
    target   text COLLATE "C" NOT NULL,
    body     bytea NOT NULL,
    attempts int NOT NULL,
    due      text COLLATE "C" NOT NULL,
    sent     text COLLATE "C" NOT NULL,
    UNIQUE (id, target)
);

CREATE INDEX notices_due ON notices (due) WHERE sent = '';
