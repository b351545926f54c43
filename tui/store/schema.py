"""The tables of a queue file: numbered migrations in plain SQL.

A migration is a tuple of statements, run once, in order, in one transaction; `user_version` counts
them. One that has been released is never edited: a change is a further one. Tables are STRICT. What
is a log carries triggers that refuse UPDATE, DELETE and an INSERT over an existing row (REPLACE
would evade the first two on a connection without recursive_triggers).
"""

from __future__ import annotations

import sqlite3

APPLICATION_ID = 0x506C6C74  # "Pllt": marks an SQLite file as a queue
UTC_CHECK = "CHECK (utc GLOB '[0-9][0-9][0-9][0-9]-[0-9][0-9]-[0-9][0-9]T*Z')"
HANDLE_CHECK = "CHECK (length(handle) BETWEEN 1 AND 32 AND handle NOT GLOB '*[^a-z0-9_-]*')"
HASH_CHECK = "length({0}) = 64 AND {0} NOT GLOB '*[^0-9a-f]*'"
CHECK_WORDS = "'star', 'instrument', 'extinction', 'blend', 'dust'"
STATE_WORDS = "'open', 'split', 'explains', 'short', 'nodata'"


def frozen(table: str, what: str, same: str) -> tuple[str, str, str]:
    """Three triggers that make `table` append-only; `same` tells when NEW would land on an existing row."""
    return (
        f"CREATE TRIGGER {table}_no_update BEFORE UPDATE ON {table} "
        f"BEGIN SELECT RAISE(ABORT, '{what} is never changed'); END",
        f"CREATE TRIGGER {table}_no_delete BEFORE DELETE ON {table} "
        f"BEGIN SELECT RAISE(ABORT, '{what} is never removed'); END",
        f"CREATE TRIGGER {table}_no_repeat BEFORE INSERT ON {table} "
        f"WHEN EXISTS (SELECT 1 FROM {table} AS old WHERE {same}) "
        f"BEGIN SELECT RAISE(ABORT, '{what} is never written twice'); END",
    )


def same(*columns: str) -> str:
    """The condition that NEW has the key of an existing row."""
    return " AND ".join(f"old.{column} = NEW.{column}" for column in columns)


MEASURED = (
    f"CREATE TABLE load (id INTEGER PRIMARY KEY, utc TEXT NOT NULL UNIQUE {UTC_CHECK}) STRICT",
    *frozen("load", "a load", "old.id = NEW.id OR old.utc = NEW.utc"),
    """CREATE TABLE candidate (
        id INTEGER PRIMARY KEY,
        name TEXT NOT NULL UNIQUE CHECK (length(name) BETWEEN 1 AND 200),
        current_version TEXT NOT NULL DEFAULT '',
        input_digest TEXT NOT NULL DEFAULT ''
    ) STRICT""",
    "CREATE TRIGGER candidate_no_rename BEFORE UPDATE OF id, name ON candidate "
    "BEGIN SELECT RAISE(ABORT, 'the name of a candidate is never changed'); END",
    "CREATE TRIGGER candidate_no_delete BEFORE DELETE ON candidate "
    "BEGIN SELECT RAISE(ABORT, 'a candidate is never removed'); END",
    "CREATE TRIGGER candidate_no_repeat BEFORE INSERT ON candidate "
    "WHEN EXISTS (SELECT 1 FROM candidate AS old WHERE old.id = NEW.id OR old.name = NEW.name) "
    "BEGIN SELECT RAISE(ABORT, 'a candidate is never written twice'); END",
    """CREATE TABLE candidate_version (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        source TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        facts TEXT NOT NULL CHECK (json_valid(facts)),
        PRIMARY KEY (candidate_id, source, digest, load_id)
    ) STRICT, WITHOUT ROWID""",
    *frozen("candidate_version", "a version of a candidate", same("candidate_id", "source", "digest", "load_id")),
    """CREATE TABLE measurement (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        band TEXT NOT NULL CHECK (length(band) BETWEEN 1 AND 200),
        source TEXT NOT NULL,
        epoch TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        value REAL,
        value_error REAL,
        unit TEXT NOT NULL,
        flux_jy REAL NOT NULL,
        error_jy REAL CHECK (error_jy IS NULL OR error_jy >= 0),
        is_limit INTEGER NOT NULL CHECK (is_limit IN (0, 1)),
        nsigma REAL NOT NULL,
        flags TEXT NOT NULL CHECK (json_valid(flags)),
        exclude INTEGER NOT NULL CHECK (exclude IN (0, 1)),
        note TEXT NOT NULL,
        PRIMARY KEY (candidate_id, band, source, epoch, digest, load_id)
    ) STRICT, WITHOUT ROWID""",
    *frozen("measurement", "a measurement", same("candidate_id", "band", "source", "epoch", "digest", "load_id")),
    """CREATE TABLE neighbour (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        source TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        position INTEGER NOT NULL CHECK (position >= 0),
        separation_arcsec REAL NOT NULL,
        position_angle_deg REAL,
        fluxes_jy TEXT NOT NULL CHECK (json_valid(fluxes_jy)),
        label TEXT NOT NULL,
        PRIMARY KEY (candidate_id, source, digest, load_id, position)
    ) STRICT, WITHOUT ROWID""",
    *frozen("neighbour", "a neighbour", same("candidate_id", "source", "digest", "load_id", "position")),
    """CREATE TABLE dip (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        source TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        position INTEGER NOT NULL CHECK (position >= 0),
        event TEXT NOT NULL,
        band TEXT NOT NULL,
        depth REAL NOT NULL,
        depth_error REAL,
        epoch TEXT NOT NULL,
        PRIMARY KEY (candidate_id, source, digest, load_id, position)
    ) STRICT, WITHOUT ROWID""",
    *frozen("dip", "a dip", same("candidate_id", "source", "digest", "load_id", "position")),
    """CREATE TABLE spectrum (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        source TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        wave_um BLOB NOT NULL,
        flux_jy BLOB NOT NULL CHECK (length(flux_jy) = length(wave_um)),
        error_jy BLOB NOT NULL CHECK (length(error_jy) = length(wave_um)),
        UNIQUE (candidate_id, source, digest, load_id)
    ) STRICT""",
    *frozen(
        "spectrum",
        "a spectrum",
        f"({same('candidate_id', 'source', 'digest', 'load_id')}) OR old.rowid = NEW.rowid",
    ),
    """CREATE TABLE cutout (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        band TEXT NOT NULL,
        source TEXT NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) = 32),
        load_id INTEGER NOT NULL REFERENCES load (id),
        height INTEGER NOT NULL CHECK (height > 0),
        width INTEGER NOT NULL CHECK (width > 0),
        arcsec_per_pixel REAL,
        facts TEXT NOT NULL CHECK (json_valid(facts)),
        image BLOB NOT NULL,
        UNIQUE (candidate_id, band, source, digest, load_id)
    ) STRICT""",
    *frozen(
        "cutout",
        "a cutout",
        f"({same('candidate_id', 'band', 'source', 'digest', 'load_id')}) OR old.rowid = NEW.rowid",
    ),
    f"""CREATE TABLE attachment (
        digest TEXT NOT NULL UNIQUE CHECK ({HASH_CHECK.format("digest")}),
        kind TEXT NOT NULL,
        name TEXT NOT NULL,
        content BLOB NOT NULL
    ) STRICT""",
    *frozen("attachment", "an attachment", "old.digest = NEW.digest OR old.rowid = NEW.rowid"),
)

RULED = (
    f"CREATE TABLE reviewer (id TEXT NOT NULL PRIMARY KEY CHECK (length(id) BETWEEN 8 AND 64), "
    f"handle TEXT NOT NULL {HANDLE_CHECK}, joined_utc TEXT NOT NULL) STRICT, WITHOUT ROWID",
    *frozen("reviewer", "a reviewer", same("id")),
    f"CREATE TABLE reviewer_rename (reviewer_id TEXT NOT NULL REFERENCES reviewer (id), "
    f"handle TEXT NOT NULL {HANDLE_CHECK}, utc TEXT NOT NULL {UTC_CHECK}, "
    "PRIMARY KEY (reviewer_id, handle, utc)) STRICT, WITHOUT ROWID",
    *frozen("reviewer_rename", "a change of handle", same("reviewer_id", "handle", "utc")),
    """CREATE TABLE evidence (
        id INTEGER PRIMARY KEY,
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        kind TEXT NOT NULL CHECK (kind IN (
            'star', 'instrument', 'extinction', 'blend', 'dust', 'mixture', 'dips')),
        version INTEGER NOT NULL,
        digest TEXT NOT NULL CHECK (length(digest) BETWEEN 1 AND 128),
        adequate INTEGER CHECK (adequate IN (0, 1)),
        content TEXT NOT NULL CHECK (json_valid(content)),
        is_current INTEGER NOT NULL CHECK (is_current IN (0, 1)),
        UNIQUE (candidate_id, kind, digest)
    ) STRICT""",
    "CREATE UNIQUE INDEX evidence_current ON evidence (candidate_id, kind) WHERE is_current = 1",
    "CREATE INDEX evidence_digest ON evidence (digest)",
    "CREATE TRIGGER evidence_no_update "
    "BEFORE UPDATE OF id, candidate_id, kind, version, digest, adequate, content ON evidence "
    "BEGIN SELECT RAISE(ABORT, 'evidence is never changed'); END",
    "CREATE TRIGGER evidence_no_repeat BEFORE INSERT ON evidence WHEN EXISTS (SELECT 1 FROM evidence AS old WHERE "
    "(old.candidate_id = NEW.candidate_id AND old.kind = NEW.kind AND old.digest = NEW.digest) OR old.id = NEW.id) "
    "BEGIN SELECT RAISE(ABORT, 'evidence is never written twice'); END",
    f"""CREATE TABLE ruling (
        seq INTEGER PRIMARY KEY,
        id TEXT NOT NULL UNIQUE CHECK (length(id) BETWEEN 8 AND 64),
        candidate TEXT NOT NULL REFERENCES candidate (name),
        "check" TEXT NOT NULL CHECK ("check" IN ({CHECK_WORDS})),
        reviewer_id TEXT NOT NULL REFERENCES reviewer (id),
        ruling TEXT NOT NULL CHECK (ruling IN ('explains', 'short', 'unclear', 'withdrawn')),
        note TEXT NOT NULL CHECK (length(note) <= 20000),
        evidence_digest TEXT NOT NULL,
        seen_others INTEGER NOT NULL CHECK (seen_others IN (0, 1)),
        replaces TEXT NOT NULL,
        utc TEXT NOT NULL {UTC_CHECK},
        previous_hash TEXT NOT NULL,
        hash TEXT NOT NULL UNIQUE CHECK ({HASH_CHECK.format("hash")}),
        CHECK (previous_hash <> hash AND replaces <> id)
    ) STRICT""",
    'CREATE INDEX ruling_candidate ON ruling (candidate, "check", evidence_digest)',
    "CREATE INDEX ruling_reviewer ON ruling (reviewer_id, seq)",
    *frozen("ruling", "a ruling", "old.id = NEW.id OR old.hash = NEW.hash OR old.seq = NEW.seq"),
    "CREATE TRIGGER ruling_chained BEFORE INSERT ON ruling WHEN NEW.previous_hash <> '' AND NOT EXISTS ("
    "SELECT 1 FROM ruling AS old WHERE old.hash = NEW.previous_hash AND old.reviewer_id = NEW.reviewer_id) "
    "BEGIN SELECT RAISE(ABORT, 'a ruling follows one of the same reviewer'); END",
    "CREATE TRIGGER ruling_replaces BEFORE INSERT ON ruling WHEN NEW.replaces <> '' AND NOT EXISTS ("
    "SELECT 1 FROM ruling AS old WHERE old.id = NEW.replaces AND old.reviewer_id = NEW.reviewer_id "
    'AND old.candidate = NEW.candidate AND old."check" = NEW."check") '
    "BEGIN SELECT RAISE(ABORT, 'a ruling replaces one of the same reviewer, candidate and check'); END",
    "CREATE TRIGGER evidence_cited BEFORE DELETE ON evidence WHEN EXISTS ("
    "SELECT 1 FROM ruling JOIN candidate ON candidate.name = ruling.candidate WHERE candidate.id = OLD.candidate_id "
    'AND ruling."check" = OLD.kind AND ruling.evidence_digest = OLD.digest) '
    "BEGIN SELECT RAISE(ABORT, 'evidence that a ruling cites is never removed'); END",
    f"CREATE TABLE setting (id TEXT NOT NULL PRIMARY KEY, name TEXT NOT NULL, value TEXT NOT NULL, "
    f"utc TEXT NOT NULL {UTC_CHECK}, reviewer_id TEXT NOT NULL) STRICT, WITHOUT ROWID",
    *frozen("setting", "a setting of the past", same("id")),
    "CREATE TABLE seal_opened (reviewer_id TEXT NOT NULL REFERENCES reviewer (id), "
    "candidate_id INTEGER NOT NULL REFERENCES candidate (id), "
    "PRIMARY KEY (reviewer_id, candidate_id)) STRICT, WITHOUT ROWID",
    *frozen("seal_opened", "an opened seal", same("reviewer_id", "candidate_id")),
)

DERIVED = (
    f"""CREATE TABLE queue_row (
        id INTEGER PRIMARY KEY REFERENCES candidate (id),
        name TEXT NOT NULL,
        fold TEXT NOT NULL,
        ring INTEGER NOT NULL,
        oddness REAL,
        odd_band TEXT NOT NULL DEFAULT '',
        odd_pull REAL,
        untestable INTEGER NOT NULL DEFAULT 0,
        star TEXT NOT NULL DEFAULT 'open' CHECK (star IN ({STATE_WORDS})),
        instrument TEXT NOT NULL DEFAULT 'open' CHECK (instrument IN ({STATE_WORDS})),
        extinction TEXT NOT NULL DEFAULT 'open' CHECK (extinction IN ({STATE_WORDS})),
        blend TEXT NOT NULL DEFAULT 'open' CHECK (blend IN ({STATE_WORDS})),
        dust TEXT NOT NULL DEFAULT 'open' CHECK (dust IN ({STATE_WORDS})),
        outcome TEXT NOT NULL DEFAULT 'pending'
            CHECK (outcome IN ('ordinary', 'explained', 'unexplained', 'pending')),
        cause TEXT NOT NULL DEFAULT '',
        pending_reason TEXT NOT NULL DEFAULT '',
        done INTEGER NOT NULL DEFAULT 0,
        needs INTEGER NOT NULL DEFAULT 1 CHECK (needs IN (0, 1)),
        touched INTEGER NOT NULL DEFAULT 0 CHECK (touched IN (0, 1))
    ) STRICT""",
    "CREATE INDEX queue_row_oddness ON queue_row (oddness DESC, id)",
    "CREATE INDEX queue_row_fold ON queue_row (fold)",
    "CREATE INDEX queue_row_band ON queue_row (odd_band DESC, oddness DESC, id)",
    "CREATE INDEX queue_row_pull ON queue_row (odd_pull DESC, id)",
    "CREATE INDEX queue_row_ring ON queue_row (needs, done, ring)",
    "CREATE INDEX queue_row_untestable ON queue_row (untestable) WHERE untestable > 0",
    "CREATE INDEX queue_row_touched ON queue_row (id) WHERE touched = 1",
    f"""CREATE TABLE standing (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        "check" TEXT NOT NULL CHECK ("check" IN ({CHECK_WORDS})),
        state TEXT NOT NULL CHECK (state IN ({STATE_WORDS})),
        explains INTEGER NOT NULL,
        short INTEGER NOT NULL,
        unclear INTEGER NOT NULL,
        revised INTEGER NOT NULL,
        stale INTEGER NOT NULL,
        PRIMARY KEY (candidate_id, "check")
    ) STRICT, WITHOUT ROWID""",
    """CREATE TABLE reviewer_row (
        reviewer_id TEXT NOT NULL REFERENCES reviewer (id),
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        star TEXT NOT NULL, instrument TEXT NOT NULL, extinction TEXT NOT NULL, blend TEXT NOT NULL, dust TEXT NOT NULL,
        stale INTEGER NOT NULL,
        ruled INTEGER NOT NULL,
        done INTEGER NOT NULL,
        seal_open INTEGER NOT NULL,
        needs_me INTEGER NOT NULL,
        PRIMARY KEY (reviewer_id, candidate_id)
    ) STRICT, WITHOUT ROWID""",
    "CREATE INDEX reviewer_row_candidate ON reviewer_row (candidate_id)",
    "CREATE INDEX reviewer_row_needs ON reviewer_row (reviewer_id, candidate_id) WHERE needs_me = 1",
)

LOCAL = (
    """CREATE TABLE claim (
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        reviewer_id TEXT NOT NULL REFERENCES reviewer (id),
        expires_utc TEXT NOT NULL,
        PRIMARY KEY (candidate_id, reviewer_id)
    ) STRICT, WITHOUT ROWID""",
    f"""CREATE TABLE draft (
        reviewer_id TEXT NOT NULL REFERENCES reviewer (id),
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        "check" TEXT NOT NULL CHECK ("check" IN ({CHECK_WORDS})),
        note TEXT NOT NULL,
        PRIMARY KEY (reviewer_id, candidate_id, "check")
    ) STRICT, WITHOUT ROWID""",
    """CREATE TABLE position (
        reviewer_id TEXT NOT NULL PRIMARY KEY REFERENCES reviewer (id),
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        "check" TEXT NOT NULL
    ) STRICT, WITHOUT ROWID""",
    """CREATE TABLE later (
        reviewer_id TEXT NOT NULL REFERENCES reviewer (id),
        candidate_id INTEGER NOT NULL REFERENCES candidate (id),
        PRIMARY KEY (reviewer_id, candidate_id)
    ) STRICT, WITHOUT ROWID""",
)

MIGRATIONS = (("m1_measured", MEASURED), ("m2_ruled", RULED), ("m3_derived", DERIVED), ("m4_local", LOCAL))
SCHEMA_VERSION = len(MIGRATIONS)


def migrate(connection: sqlite3.Connection, up_to: int = SCHEMA_VERSION) -> None:
    """Run the migrations that `connection` lacks; the caller holds the write lock (BEGIN IMMEDIATE)."""
    from sqlite_utils import Database
    from sqlite_utils.migrations import Migrations

    numbered = Migrations("plainlight")
    for name, statements in MIGRATIONS[:up_to]:
        numbered(name=name)(runner(statements))
    numbered.apply(Database(connection, execute_plugins=False))
    connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
    connection.execute(f"PRAGMA user_version = {up_to}")


def runner(statements: tuple[str, ...]):
    """A function of the form that sqlite-utils calls for one migration."""

    def run(db) -> None:
        for statement in statements:
            db.conn.execute(statement)

    return run
