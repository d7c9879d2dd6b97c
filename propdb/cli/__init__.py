"""The command line: one module per verb, loaded when the verb is called."""

from __future__ import annotations


def main() -> None:
    """Run ``propdb`` on the arguments of this process and exit with its code."""
    from propdb.cli.main import run

    run()
