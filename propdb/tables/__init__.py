"""Whole tables: convert them, evaluate them, add them up, make them.

* :func:`propdb.tables.core.convert_batch`: the core, on Arrow record batches; all formats and engines go through it or
  through its parts
* :mod:`propdb.tables.columns`: which column is what, in which unit
* :mod:`propdb.tables.kinds`: what one species on one datum needs; :mod:`propdb.tables.varying`: where that depends on T
* :mod:`propdb.tables.delimited`, :mod:`propdb.tables.parquet`, :mod:`propdb.tables.excel`: the formats
* :mod:`propdb.tables.output`: whole or not at all; :mod:`propdb.tables.record`: the sidecar
* :mod:`propdb.tables.streams`: enthalpy flows and duty; :mod:`propdb.tables.suggest`: which datum serves best
* :mod:`propdb.tables.tabulate`: tables made from the store
"""
