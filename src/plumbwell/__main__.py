"""``python -m plumbwell``: the same command line as ``plumbwell``."""

import sys

from plumbwell.cli import main

if __name__ == "__main__":
    sys.exit(main())
