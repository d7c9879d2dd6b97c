-- What other compilations say of an entry. Derived: outside every hash, and made anew when what it was read from changes.

CREATE TABLE crosscheck (
    entry       INTEGER NOT NULL REFERENCES entry (num),
    compilation TEXT NOT NULL CHECK (compilation <> ''),
    temperature REAL NOT NULL CHECK (temperature = -1 OR (temperature >= 0 AND temperature < 1e300)), -- [K]; -1 where there is none
    value       REAL NOT NULL CONSTRAINT "a value is a finite number" CHECK (value > -1e300 AND value < 1e300),
    difference  REAL NOT NULL CONSTRAINT "a difference is a finite number" CHECK (difference > -1e300 AND difference < 1e300),
    allowed     REAL CHECK (allowed >= 0 AND allowed < 1e300), -- NULL where the compilation is shown only
    independent INTEGER NOT NULL CHECK (independent IN (0, 1)),
    package     TEXT NOT NULL,
    PRIMARY KEY (entry, compilation, temperature)
) STRICT, WITHOUT ROWID;
