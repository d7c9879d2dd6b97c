-- Enthalpies tabulated on a datum of their own ('H'); drafts that are refused ('rejected'); events about the store:
-- own species, sources, datums and policy ('defined'), and settings ('setting').
--
-- A CHECK cannot be altered, so both tables are made anew with what they held. The rows that refer to them are looked
-- at when the transaction ends.

PRAGMA defer_foreign_keys = ON;
CREATE TEMP TABLE old_entry AS SELECT * FROM entry;
CREATE TEMP TABLE old_event AS SELECT * FROM event;
CREATE TEMP TABLE old_sequence AS SELECT seq FROM sqlite_sequence WHERE name = 'event';
DROP TABLE event;
DROP TABLE entry;

-- `id` hashes every other column but `num`. `identity` is that of its species; which row of `species` lists it, the
-- membership says.
CREATE TABLE entry (
    num              INTEGER PRIMARY KEY,
    id               TEXT NOT NULL UNIQUE CHECK (length(id) >= 16),
    identity         TEXT NOT NULL CHECK (identity <> ''),
    quantity         TEXT NOT NULL CONSTRAINT "unknown quantity" CHECK (quantity IN
                     ('Hf', 'Gf', 'S', 'Cp', 'Hvap', 'Hfus', 'Hsub', 'Htr', 'dH0', 'Tb', 'Tm', 'Tc', 'Pc', 'omega', 'H')),
    phase            TEXT NOT NULL CONSTRAINT "unknown phase" CHECK (phase IN ('cr', 'am', 'l', 'g', 'fluid', 'aq')),
    form             TEXT NOT NULL,
    "to"             TEXT NOT NULL,
    equation         TEXT NOT NULL,
    temperature      REAL CONSTRAINT "a temperature is finite and not below 0 K" CHECK (temperature >= 0 AND temperature < 1e300),
    value            REAL CONSTRAINT "a value is a finite number" CHECK (value > -1e300 AND value < 1e300),
    unit             TEXT NOT NULL,
    carried          TEXT NOT NULL,
    carried_unit     TEXT NOT NULL,
    params           TEXT NOT NULL CONSTRAINT "params are JSON with finite numbers" CHECK (json_valid(params)),
    tmin             REAL CONSTRAINT "tmin is finite and not below 0 K" CHECK (tmin >= 0 AND tmin < 1e300),
    tmax             REAL CONSTRAINT "tmax is finite and not below 0 K" CHECK (tmax >= 0 AND tmax < 1e300),
    uncertainty      REAL CONSTRAINT "an uncertainty is finite and not negative" CHECK (uncertainty >= 0 AND uncertainty < 1e300),
    uncertainty_unit TEXT NOT NULL CHECK (uncertainty_unit IN ('', '%')),
    uncertainty_kind TEXT NOT NULL CONSTRAINT "unknown kind of uncertainty"
                     CHECK (uncertainty_kind IN ('', 'standard', 'expanded-95', 'maximum', 'class')),
    datum            TEXT NOT NULL,
    conditions       TEXT NOT NULL,
    source           TEXT NOT NULL CONSTRAINT "an entry needs a source" CHECK (source <> '') REFERENCES source_key (key),
    locator          TEXT NOT NULL,
    CONSTRAINT "tmin is above tmax" CHECK (tmin <= tmax),
    CONSTRAINT "a constant needs its value" CHECK (equation <> '' OR value IS NOT NULL)
) STRICT;
INSERT INTO entry SELECT * FROM old_entry;
CREATE INDEX entry_source ON entry (source);
CREATE TRIGGER entry_fixed BEFORE UPDATE ON entry BEGIN
    SELECT RAISE(ABORT, 'an entry is never altered');
END;
CREATE TRIGGER entry_kept BEFORE DELETE ON entry BEGIN
    SELECT RAISE(ABORT, 'an entry is never deleted');
END;
-- INSERT OR REPLACE would delete without firing the trigger above: an entry that is there stays as it is.
CREATE TRIGGER entry_once BEFORE INSERT ON entry WHEN EXISTS (SELECT 1 FROM entry WHERE id = NEW.id OR num = NEW.num) BEGIN
    SELECT RAISE(IGNORE);
END;

-- AUTOINCREMENT remembers the highest number given, so that events missing at the end show.
-- status: what the event makes of the entry, '' where it changes nothing.
CREATE TABLE event (
    seq     INTEGER PRIMARY KEY AUTOINCREMENT,
    utc     TEXT NOT NULL CHECK (length(utc) = 27 AND utc LIKE '____-__-__T__:__:__.______Z'),
    kind    TEXT NOT NULL CONSTRAINT "unknown kind of event" CHECK (kind IN
            ('created', 'checked', 'approved', 'rejected', 'disputed', 'quarantined', 'superseded', 'withdrawn', 'waived', 'base',
             'defined', 'setting')),
    entry   TEXT REFERENCES entry (id),
    who     TEXT NOT NULL CONSTRAINT "an event needs a name behind it" CHECK (who <> ''),
    comment TEXT NOT NULL,
    payload TEXT NOT NULL CHECK (json_valid(payload)),
    status  TEXT NOT NULL CHECK (status IN ('', 'approved', 'checked', 'base', 'disputed', 'estimate', 'quarantined',
                                            'datum-unknown', 'draft', 'superseded', 'withdrawn')),
    prev    TEXT NOT NULL,
    hash    TEXT NOT NULL UNIQUE CHECK (length(hash) = 64),
    CONSTRAINT "an event about an entry names it, one about the store has no entry"
    CHECK ((kind IN ('base', 'defined', 'setting')) = (entry IS NULL))
) STRICT;
INSERT INTO event SELECT * FROM old_event ORDER BY seq;
UPDATE sqlite_sequence SET seq = max(seq, coalesce((SELECT seq FROM old_sequence), 0)) WHERE name = 'event';
CREATE INDEX event_status ON event (entry, seq, status) WHERE status <> '';
CREATE INDEX event_entry ON event (entry, seq) WHERE entry IS NOT NULL;
CREATE INDEX event_base ON event (seq) WHERE kind = 'base';
CREATE TRIGGER event_fixed BEFORE UPDATE ON event BEGIN
    SELECT RAISE(ABORT, 'an event is never altered');
END;
CREATE TRIGGER event_kept BEFORE DELETE ON event BEGIN
    SELECT RAISE(ABORT, 'an event is never deleted');
END;
CREATE TRIGGER event_next BEFORE INSERT ON event
WHEN NEW.seq IS NOT (SELECT coalesce(max(seq), 0) + 1 FROM event)
  OR NEW.prev IS NOT coalesce((SELECT hash FROM event ORDER BY seq DESC LIMIT 1), '') BEGIN
    SELECT RAISE(ABORT, 'an event follows the last one');
END;

DROP TABLE temp.old_entry;
DROP TABLE temp.old_event;
DROP TABLE temp.old_sequence;
