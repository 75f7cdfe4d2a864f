"""``python -m vib``: the same as the command ``vib``."""

import sys

from vib.cli import run

if __name__ == "__main__":
    sys.exit(run())
