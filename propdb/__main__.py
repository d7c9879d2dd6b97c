"""``python -m propdb`` is ``propdb``."""

from propdb.cli import main

if __name__ == "__main__":
    main()
