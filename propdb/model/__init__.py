"""Frozen records: what a species, a source, an entry, a datum, a state, a step and an answer are. No behaviour beyond display."""
