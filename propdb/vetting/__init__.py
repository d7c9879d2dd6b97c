"""Looking at entries: what other compilations say of them, and whether they contradict each other.

Import from the modules; this package imports none of them.
"""
