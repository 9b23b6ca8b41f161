"""`python -m twofluid` is the command line."""

import sys

from twofluid.cli import main

if __name__ == "__main__":
    sys.exit(main())
