-- The first schema of a propdb store.
--
-- Three kinds of rows. What a base supplies (own = 0) is replaced by the next base where it changed; rows that the next
-- base lacks stay, with active = 0. What people supply (own = 1) stands beside the base's row of the same key and wins.
-- Entries and events are never altered nor deleted: triggers refuse it, whoever asks.
--
-- SQLite turns NaN into NULL when it is bound, so NOT NULL refuses it; an infinite number fails the range checks.

CREATE TABLE migration (
    number  INTEGER PRIMARY KEY,
    name    TEXT NOT NULL,
    sha256  TEXT NOT NULL,
    applied TEXT NOT NULL
) STRICT;

-- identity: CAS RN, else InChIKey, else name; formula; charge. canon: the row that stands for this species (itself, or
-- the row that the user or a newer base put in its place).
CREATE TABLE species (
    id          INTEGER PRIMARY KEY,
    identity    TEXT NOT NULL,
    canon       INTEGER NOT NULL,
    own         INTEGER NOT NULL CHECK (own IN (0, 1)),
    active      INTEGER NOT NULL CHECK (active IN (0, 1)),
    name        TEXT NOT NULL CONSTRAINT "a species needs a name" CHECK (name <> ''),
    formula     TEXT NOT NULL,
    charge      INTEGER NOT NULL,
    composition TEXT NOT NULL CHECK (json_valid(composition)),
    molar_mass  REAL NOT NULL CONSTRAINT "a molar mass is positive and finite" CHECK (molar_mass > 0 AND molar_mass < 1e300),
    cas         TEXT NOT NULL,
    inchikey    TEXT NOT NULL,
    synonyms    TEXT NOT NULL CHECK (json_valid(synonyms)),
    vapour      TEXT NOT NULL,
    kind        TEXT NOT NULL CHECK (kind IN ('species', 'pseudo')),
    note        TEXT NOT NULL
) STRICT;
CREATE UNIQUE INDEX species_identity ON species (identity, own);
CREATE UNIQUE INDEX species_active_name ON species (name, own) WHERE active = 1;
CREATE INDEX species_name ON species (name);
CREATE INDEX species_canon ON species (canon);

-- What people may type for a species: `folded` is compared, `text` is what was written.
CREATE TABLE name (
    num     INTEGER PRIMARY KEY,
    species INTEGER NOT NULL REFERENCES species (id) ON DELETE CASCADE,
    kind    TEXT NOT NULL CHECK (kind IN ('name', 'synonym', 'formula', 'cas', 'inchikey')),
    folded  TEXT NOT NULL CHECK (folded <> ''),
    text    TEXT NOT NULL
) STRICT;
CREATE INDEX name_folded ON name (folded, kind, species);
CREATE INDEX name_species ON name (species);
CREATE INDEX name_formula ON name (folded COLLATE NOCASE) WHERE kind = 'formula';

-- detail=none keeps only which rows hold a trigram; the search ANDs the trigrams and then compares the text itself.
CREATE VIEW name_text AS SELECT num, folded FROM name WHERE kind IN ('name', 'synonym');
CREATE VIRTUAL TABLE name_trigram USING fts5 (
    folded, content = 'name_text', content_rowid = 'num', tokenize = 'trigram case_sensitive 1', detail = none, columnsize = 0
);
CREATE TRIGGER name_indexed AFTER INSERT ON name WHEN NEW.kind IN ('name', 'synonym') BEGIN
    INSERT INTO name_trigram (rowid, folded) VALUES (NEW.num, NEW.folded);
END;
CREATE TRIGGER name_unindexed AFTER DELETE ON name WHEN OLD.kind IN ('name', 'synonym') BEGIN
    INSERT INTO name_trigram (name_trigram, rowid, folded) VALUES ('delete', OLD.num, OLD.folded);
END;
CREATE TRIGGER name_fixed BEFORE UPDATE ON name BEGIN
    SELECT RAISE(ABORT, 'a name is added or removed, not altered');
END;

CREATE TABLE source_key (
    key TEXT PRIMARY KEY CONSTRAINT "a source needs a key" CHECK (key <> '')
) STRICT, WITHOUT ROWID;

CREATE TABLE source (
    key               TEXT NOT NULL REFERENCES source_key (key),
    own               INTEGER NOT NULL CHECK (own IN (0, 1)),
    active            INTEGER NOT NULL CHECK (active IN (0, 1)),
    title             TEXT NOT NULL CONSTRAINT "a source needs a title" CHECK (title <> ''),
    authors           TEXT NOT NULL CHECK (json_valid(authors)),
    year              INTEGER,
    kind              TEXT NOT NULL,
    class             TEXT NOT NULL,
    terms             TEXT NOT NULL,
    fields            TEXT NOT NULL CHECK (json_valid(fields)),
    carrier           TEXT NOT NULL,
    standard_pressure REAL NOT NULL CONSTRAINT "a standard pressure is positive and finite"
                      CHECK (standard_pressure > 0 AND standard_pressure < 1e300),
    note              TEXT NOT NULL,
    PRIMARY KEY (key, own)
) STRICT;

CREATE TABLE lineage (
    source   TEXT NOT NULL,
    own      INTEGER NOT NULL,
    position INTEGER NOT NULL,
    copies   TEXT NOT NULL,
    evidence TEXT NOT NULL,
    PRIMARY KEY (source, own, position),
    FOREIGN KEY (source, own) REFERENCES source (key, own) ON DELETE CASCADE
) STRICT, WITHOUT ROWID;

CREATE TABLE datum (
    name   TEXT NOT NULL CHECK (name <> ''),
    own    INTEGER NOT NULL CHECK (own IN (0, 1)),
    active INTEGER NOT NULL CHECK (active IN (0, 1)),
    body   TEXT NOT NULL CHECK (json_valid(body)),
    PRIMARY KEY (name, own)
) STRICT;

CREATE TABLE policy (
    key    TEXT NOT NULL CHECK (key <> ''),
    own    INTEGER NOT NULL CHECK (own IN (0, 1)),
    active INTEGER NOT NULL CHECK (active IN (0, 1)),
    value  TEXT NOT NULL CHECK (json_valid(value)),
    PRIMARY KEY (key, own)
) STRICT;

-- `id` hashes every other column but `num`. `identity` is that of its species; which row of `species` lists it, the
-- membership says.
CREATE TABLE entry (
    num              INTEGER PRIMARY KEY,
    id               TEXT NOT NULL UNIQUE CHECK (length(id) >= 16),
    identity         TEXT NOT NULL CHECK (identity <> ''),
    quantity         TEXT NOT NULL CONSTRAINT "unknown quantity" CHECK (quantity IN
                     ('Hf', 'Gf', 'S', 'Cp', 'Hvap', 'Hfus', 'Hsub', 'Htr', 'dH0', 'Tb', 'Tm', 'Tc', 'Pc', 'omega')),
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

CREATE TABLE carrier (
    entry   INTEGER NOT NULL REFERENCES entry (num),
    package TEXT NOT NULL,
    version TEXT NOT NULL,
    file    TEXT NOT NULL,
    row     INTEGER NOT NULL, -- -1 where there is none
    how     TEXT NOT NULL,
    PRIMARY KEY (entry, package, version, file, row, how)
) STRICT, WITHOUT ROWID;

-- AUTOINCREMENT remembers the highest number given, so that events missing at the end show.
-- status: what the event makes of the entry, '' where it changes nothing.
CREATE TABLE event (
    seq     INTEGER PRIMARY KEY AUTOINCREMENT,
    utc     TEXT NOT NULL CHECK (length(utc) = 27 AND utc LIKE '____-__-__T__:__:__.______Z'),
    kind    TEXT NOT NULL CONSTRAINT "unknown kind of event" CHECK (kind IN
            ('created', 'checked', 'approved', 'disputed', 'quarantined', 'superseded', 'withdrawn', 'waived', 'base')),
    entry   TEXT REFERENCES entry (id),
    who     TEXT NOT NULL CONSTRAINT "an event needs a name behind it" CHECK (who <> ''),
    comment TEXT NOT NULL,
    payload TEXT NOT NULL CHECK (json_valid(payload)),
    status  TEXT NOT NULL CHECK (status IN ('', 'approved', 'checked', 'base', 'disputed', 'estimate', 'quarantined',
                                            'datum-unknown', 'draft', 'superseded', 'withdrawn')),
    prev    TEXT NOT NULL,
    hash    TEXT NOT NULL UNIQUE CHECK (length(hash) = 64),
    CONSTRAINT "a base event has no entry, every other event has one" CHECK ((kind = 'base') = (entry IS NULL))
) STRICT;
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

-- Which entries a base holds (base: the seq of its base event) or a user created (base: the seq of the created event), and
-- under which species.
CREATE TABLE base_entry (
    species INTEGER NOT NULL REFERENCES species (id),
    base    INTEGER NOT NULL REFERENCES event (seq),
    entry   INTEGER NOT NULL REFERENCES entry (num),
    own     INTEGER NOT NULL CHECK (own IN (0, 1)),
    status  TEXT NOT NULL CONSTRAINT "unknown status" CHECK (status IN
            ('approved', 'checked', 'base', 'disputed', 'estimate', 'quarantined', 'datum-unknown', 'draft', 'superseded', 'withdrawn')),
    note    TEXT NOT NULL,
    printed INTEGER NOT NULL CHECK (printed IN (0, 1)),
    PRIMARY KEY (species, base, entry)
) STRICT, WITHOUT ROWID;
CREATE UNIQUE INDEX base_entry_entry ON base_entry (entry, base);
CREATE INDEX base_entry_base ON base_entry (base);
CREATE TRIGGER base_entry_fixed BEFORE UPDATE ON base_entry BEGIN
    SELECT RAISE(ABORT, 'the members of a base are never altered');
END;
CREATE TRIGGER base_entry_kept BEFORE DELETE ON base_entry BEGIN
    SELECT RAISE(ABORT, 'the members of a base are never deleted');
END;
CREATE TRIGGER base_entry_once BEFORE INSERT ON base_entry
WHEN EXISTS (SELECT 1 FROM base_entry WHERE entry = NEW.entry AND base = NEW.base) BEGIN
    SELECT RAISE(ABORT, 'a base lists an entry once');
END;
