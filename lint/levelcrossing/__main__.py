"""Run the command line with ``python -m levelcrossing``."""

from levelcrossing.cli import main

if __name__ == "__main__":
    raise SystemExit(main())
