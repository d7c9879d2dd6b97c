"""The store: one SQLite file with entries, sources, datums, policy, and an append-only log.

Reading uses plain ``sqlite3`` (:mod:`~propdb.store.open`, :mod:`~propdb.store.read`, :mod:`~propdb.store.search`,
:mod:`~propdb.store.log`) and imports nothing heavy; writing (:mod:`~propdb.store.write`, :mod:`~propdb.store.own`) uses
``sqlite-utils`` inside one IMMEDIATE transaction. Import from the modules; this package imports none of them.
"""
