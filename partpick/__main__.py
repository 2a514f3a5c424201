"""Runs the command line as `python -m partpick`."""

import sys

from partpick.cli import main

if __name__ == "__main__":
    sys.exit(main())
