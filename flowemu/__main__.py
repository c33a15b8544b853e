"""`python -m flowemu` is the command line."""

import sys

from flowemu.cli import main

if __name__ == "__main__":
    sys.exit(main())
