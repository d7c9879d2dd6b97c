"""Frozen records: species, source, entry, datum, state, step, answer. No behaviour beyond display."""
