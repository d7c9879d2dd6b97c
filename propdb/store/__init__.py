"""The store: one SQLite file with entries, sources, datums, policy, and an append-only log.

Plain ``sqlite3`` and nothing heavy, whether it is read (:mod:`~propdb.store.open`, :mod:`~propdb.store.read`,
:mod:`~propdb.store.search`, :mod:`~propdb.store.log`) or written, inside one IMMEDIATE transaction
(:mod:`~propdb.store.write`, :mod:`~propdb.store.own`). Import from the modules; this package imports none of them.
"""
