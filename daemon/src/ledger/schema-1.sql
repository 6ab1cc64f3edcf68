-- What each path in a watched folder looked like when its content was last dealt with.
CREATE TABLE file (
  instrument TEXT NOT NULL,
  path       BLOB NOT NULL,                 -- the bytes of the absolute path
  size       INTEGER NOT NULL,
  mtime      INTEGER NOT NULL,              -- ns since 1970; these five only say "look again"
  ctime      INTEGER NOT NULL,
  device     INTEGER NOT NULL,
  inode      INTEGER NOT NULL,
  export     INTEGER REFERENCES export(id), -- NULL: content not read yet
  attempts   INTEGER NOT NULL DEFAULT 0,    -- readers of this content that died
  gone       INTEGER NOT NULL DEFAULT 0,    -- a full look no longer found it
  PRIMARY KEY (instrument, path)
) WITHOUT ROWID;

-- The bytes of every export that a plan uses, kept as evidence.
CREATE TABLE raw (
  sha256 BLOB PRIMARY KEY,
  size   INTEGER NOT NULL,
  packed BLOB NOT NULL                      -- zlib
) WITHOUT ROWID;

-- One content under one path, read once.
CREATE TABLE export (
  id         INTEGER PRIMARY KEY,
  instrument TEXT NOT NULL,
  path       BLOB NOT NULL,
  shown      TEXT NOT NULL,                 -- path below the watched folder, as shown to people
  sha256     BLOB NOT NULL,
  rule_mark  TEXT NOT NULL,                 -- changes with the rule, the plan that takes it, and that plan's list
  arrived    INTEGER NOT NULL,              -- ms since 1970, our clock
  plan       TEXT,                          -- NULL: not for a plan
  state      TEXT NOT NULL CHECK (state IN ('read', 'refused', 'no plan', 'replaced')),
  sentence   TEXT,                          -- why it was refused
  hint       TEXT,
  readings   INTEGER NOT NULL,              -- every reading met in it, usable or not
  unplanned  INTEGER NOT NULL               -- of these: characteristics that the plan's list does not name
);
CREATE INDEX export_by_digest ON export (sha256, instrument);

-- What could not be used, run by run.
CREATE TABLE set_aside (
  id       INTEGER PRIMARY KEY,
  export   INTEGER NOT NULL REFERENCES export(id),
  place    TEXT NOT NULL,
  found    TEXT NOT NULL,
  expected TEXT NOT NULL,
  hint     TEXT,
  reason   TEXT NOT NULL,
  run      TEXT,                            -- the run's roles as far as known, JSON
  readings INTEGER NOT NULL
);
CREATE INDEX set_aside_by_export ON set_aside (export);

CREATE TABLE round (
  id       INTEGER PRIMARY KEY,
  plan     TEXT NOT NULL,
  number   INTEGER NOT NULL,
  label    TEXT,                            -- the export's own name of the round
  state    TEXT NOT NULL CHECK (state IN ('pending', 'open', 'held', 'complete', 'unfinished')),
  reason   TEXT,                            -- why it is held or unfinished
  opened   INTEGER,                         -- ms since 1970, our clock
  closed   INTEGER,
  through  TEXT,                            -- civil time; a run taken up to then is not for a later round
  revision INTEGER NOT NULL DEFAULT 1,
  analysed INTEGER NOT NULL DEFAULT 0,      -- last revision with its studies recorded
  reported INTEGER NOT NULL DEFAULT 0,      -- last revision with its report written
  UNIQUE (plan, number)
);

-- One part measured once by one appraiser; its readings may come in several exports.
CREATE TABLE run (
  id          INTEGER PRIMARY KEY,
  plan        TEXT NOT NULL,
  key         TEXT NOT NULL,                -- folded roles, JSON: what makes two deliveries the same run
  instrument  TEXT NOT NULL,
  part        TEXT NOT NULL,
  appraiser   TEXT,
  trial       TEXT,
  factors     TEXT NOT NULL,                -- JSON object
  same        TEXT NOT NULL,                -- JSON object
  taken       TEXT,                         -- civil time of the instrument
  round_label TEXT,
  holds       TEXT NOT NULL,                -- JSON object: the characteristics it has values of, with units
  tie         TEXT,                         -- why its deliveries contradict each other
  changed     INTEGER NOT NULL DEFAULT 0,   -- its values differ from those its closed round was worked out with
  round       INTEGER REFERENCES round(id),
  slot        INTEGER,                      -- which trial of its cell, from 0
  status      TEXT NOT NULL DEFAULT 'used' CHECK (status IN
    ('used', 'surplus', 'late', 'set aside', 'held', 'excluded', 'unfinished')),
  reason      TEXT,
  UNIQUE (plan, key)
);
CREATE INDEX run_by_round ON run (round);

-- The readings that one export brought for one run, packed.
CREATE TABLE delivery (
  export     INTEGER NOT NULL REFERENCES export(id),
  run        INTEGER NOT NULL REFERENCES run(id),
  readings   TEXT NOT NULL,                 -- JSON, see ledger/readings.rs
  count      INTEGER NOT NULL,
  copies     INTEGER NOT NULL,              -- of these: the value was known already
  superseded INTEGER NOT NULL,              -- of these: a later export gave another value
  PRIMARY KEY (run, export)
) WITHOUT ROWID;
CREATE INDEX delivery_by_export ON delivery (export);

-- A person's decisions and events told to the service; never changed, never deleted.
CREATE TABLE decision (
  id     INTEGER PRIMARY KEY,
  at     INTEGER NOT NULL,
  who    TEXT NOT NULL,
  reason TEXT NOT NULL,
  kind   TEXT NOT NULL,
  plan   TEXT NOT NULL,
  round  INTEGER REFERENCES round(id),
  body   TEXT NOT NULL                      -- JSON
);

CREATE TABLE study (
  round          INTEGER NOT NULL REFERENCES round(id),
  revision       INTEGER NOT NULL,
  characteristic TEXT NOT NULL,
  record         TEXT NOT NULL,             -- the study record, JSON
  share          REAL,
  standing       TEXT NOT NULL,
  PRIMARY KEY (round, revision, characteristic)
) WITHOUT ROWID;

-- Where each characteristic stands now.
CREATE TABLE standing (
  plan           TEXT NOT NULL,
  characteristic TEXT NOT NULL,
  round          INTEGER NOT NULL REFERENCES round(id),
  revision       INTEGER NOT NULL,
  now            TEXT NOT NULL,
  since          INTEGER NOT NULL REFERENCES round(id),
  share          REAL,
  PRIMARY KEY (plan, characteristic)
) WITHOUT ROWID;

-- Notices owed and delivered: one row a recipient and channel.
CREATE TABLE outbox (
  id         INTEGER PRIMARY KEY,
  channel    TEXT NOT NULL,                 -- 'log', 'mail'; later 'webhook', 'mirror'
  recipient  TEXT NOT NULL,
  key        TEXT NOT NULL,                 -- made from site, plan, round, revision, kind, recipient
  thread     TEXT NOT NULL,
  plan       TEXT,
  round      INTEGER REFERENCES round(id),
  kind       TEXT NOT NULL,
  subject    TEXT NOT NULL,
  bytes      BLOB NOT NULL,                 -- finished: what is sent, to the byte
  created    INTEGER NOT NULL,
  state      TEXT NOT NULL DEFAULT 'owed' CHECK (state IN ('owed', 'delivered', 'refused')),
  attempts   INTEGER NOT NULL DEFAULT 0,
  next_try   INTEGER NOT NULL,
  last_error TEXT,
  delivered  INTEGER,
  UNIQUE (channel, recipient, key)
);
CREATE INDEX outbox_owed ON outbox (next_try) WHERE state = 'owed';

-- What has been said once and need not be said again.
CREATE TABLE said (
  key   TEXT PRIMARY KEY,
  first INTEGER NOT NULL,
  last  INTEGER NOT NULL
) WITHOUT ROWID;
