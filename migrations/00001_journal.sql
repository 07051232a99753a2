-- +goose Up

-- Times are UTC, RFC 3339 with microseconds and a Z: text that sorts as it reads.
-- elapsed is seconds of bench time since the run began, monotonic.
-- Flags and raw replies are JSON arrays.

CREATE TABLE run (
    id           INTEGER PRIMARY KEY AUTOINCREMENT,
    state        TEXT    NOT NULL CHECK (state IN ('preparing', 'running', 'held', 'asking', 'making_safe',
                                                   'done', 'stopped', 'tripped', 'failed', 'interrupted')),
    reason       TEXT    NOT NULL,               -- why it ended, in words
    plan         TEXT    NOT NULL,
    board        TEXT    NOT NULL,
    revision     TEXT    NOT NULL,
    board_serial TEXT    NOT NULL,
    bench        TEXT    NOT NULL,
    operator     TEXT    NOT NULL,
    note         TEXT    NOT NULL,
    started_at   TEXT    NOT NULL CHECK (started_at LIKE '____-__-__T__:__:__.______Z'),
    ended_at     TEXT             CHECK (ended_at   LIKE '____-__-__T__:__:__.______Z'),
    planned      INTEGER NOT NULL CHECK (planned >= 0),
    measured     INTEGER NOT NULL DEFAULT 0 CHECK (measured >= 0),
    flagged      INTEGER NOT NULL DEFAULT 0 CHECK (flagged BETWEEN 0 AND measured),
    pace         REAL    NOT NULL CHECK (pace > 0),
    seed         TEXT    NOT NULL,               -- unsigned 64-bit, decimal: too wide for INTEGER
    version      TEXT    NOT NULL,               -- of the program
    quantities   TEXT    NOT NULL CHECK (json_type(quantities)  = 'array'),
    instruments  TEXT    NOT NULL CHECK (json_type(instruments) = 'array'),
    CHECK ((ended_at IS NOT NULL) = (state IN ('done', 'stopped', 'tripped', 'failed', 'interrupted')))
) STRICT;

-- One bench, one open run.
CREATE UNIQUE INDEX run_one_open ON run (ended_at IS NULL) WHERE ended_at IS NULL;

-- The bench, board and plan files, verbatim as they were when the run began.
CREATE TABLE file (
    run      INTEGER NOT NULL REFERENCES run (id),
    position INTEGER NOT NULL,
    role     TEXT    NOT NULL,
    name     TEXT    NOT NULL,
    sha256   TEXT    NOT NULL,
    text     TEXT    NOT NULL,
    PRIMARY KEY (run, position)
) STRICT, WITHOUT ROWID;

CREATE TABLE point (
    id             INTEGER PRIMARY KEY AUTOINCREMENT,
    run            INTEGER NOT NULL REFERENCES run (id),
    setpoint       INTEGER NOT NULL CHECK (setpoint >= 0),     -- its index in the plan's order of visit
    supply_voltage REAL    NOT NULL,                           -- V, as set
    pot_code       INTEGER NOT NULL,
    pot_resistance REAL    NOT NULL,                           -- ohm, of the code
    direction      TEXT    NOT NULL,
    pass           INTEGER NOT NULL,
    recheck        INTEGER NOT NULL CHECK (recheck IN (0, 1)),
    at             TEXT    NOT NULL CHECK (at LIKE '____-__-__T__:__:__.______Z'),
    elapsed        REAL    NOT NULL,
    flags          TEXT    NOT NULL CHECK (json_type(flags) = 'array')
) STRICT;

-- None twice: a setpoint is measured once in a run.
CREATE UNIQUE INDEX point_none_twice ON point (run, setpoint);

CREATE TABLE reading (
    point    INTEGER NOT NULL REFERENCES point (id),
    position INTEGER NOT NULL,
    quantity TEXT    NOT NULL,
    value    REAL    CHECK (abs(value) < 1e30),                -- NULL: a flag says why there is none
    u        REAL    CHECK (u >= 0 AND u < 1e30),              -- standard uncertainty, in unit
    dof      REAL    CHECK (dof > 0 AND dof < 1e30),           -- NULL: infinitely many
    unit     TEXT    NOT NULL,
    road     TEXT    NOT NULL,
    flags    TEXT    NOT NULL CHECK (json_type(flags) = 'array'),
    raw      TEXT    NOT NULL CHECK (json_type(raw)   = 'array'),
    PRIMARY KEY (point, position),
    UNIQUE (point, quantity, road),
    CHECK ((value IS NULL) = (u IS NULL)),
    CHECK (value IS NOT NULL OR json_array_length(flags) > 0)
) STRICT, WITHOUT ROWID;

-- What the schematic gave while the run went on: kept, since a later program may predict otherwise.
CREATE TABLE prediction (
    point    INTEGER NOT NULL REFERENCES point (id),
    quantity TEXT    NOT NULL,
    value    REAL    NOT NULL CHECK (abs(value) < 1e30),
    low      REAL    NOT NULL CHECK (abs(low)   < 1e30),
    high     REAL    NOT NULL CHECK (abs(high)  < 1e30),
    unit     TEXT    NOT NULL,
    PRIMARY KEY (point, quantity),
    CHECK (low <= high)
) STRICT, WITHOUT ROWID;

-- Raw waveforms: volts = code * volts_per_code + volts_at_zero; codes are int16, little-endian.
CREATE TABLE record (
    point          INTEGER NOT NULL REFERENCES point (id),
    position       INTEGER NOT NULL,
    node           TEXT    NOT NULL,
    channel        INTEGER NOT NULL,
    start          REAL    NOT NULL,                           -- s from the trigger
    interval       REAL    NOT NULL CHECK (interval > 0),      -- s
    volts_per_code REAL    NOT NULL,
    volts_at_zero  REAL    NOT NULL,
    codes          BLOB    NOT NULL CHECK (length(codes) % 2 = 0),
    PRIMARY KEY (point, position)
) STRICT;

-- The journal. seq is global over all runs and never reused. A point's entry refers to its row.
CREATE TABLE entry (
    seq       INTEGER PRIMARY KEY AUTOINCREMENT,
    run       INTEGER REFERENCES run (id),                     -- NULL: no run
    at        TEXT    NOT NULL CHECK (at LIKE '____-__-__T__:__:__.______Z'),
    elapsed   REAL    NOT NULL,
    kind      TEXT    NOT NULL CHECK (kind IN ('started', 'state', 'energising', 'off', 'point', 'log', 'trip', 'ended')),
    words     TEXT    NOT NULL,
    state     TEXT    NOT NULL,                                -- empty: unchanged
    point     INTEGER UNIQUE REFERENCES point (id),
    off       TEXT    CHECK (json_type(off)       = 'object'),
    curves    TEXT    CHECK (json_type(curves)    = 'array'),
    setpoints TEXT    CHECK (json_type(setpoints) = 'array'),
    CHECK ((kind = 'point') = (point IS NOT NULL))
) STRICT;

CREATE INDEX entry_of_run ON entry (run, kind);
