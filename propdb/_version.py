"""The version, a literal: reading installed metadata would cost 50 ms at every start."""

__version__ = "0.1.0"
