"""Levels: the enthalpy of every state of a species on the internal scale, and the path that leads there. No I/O."""
