"""Bringing data in: seed files, packages, templates. Each reader reports before anything is committed."""
