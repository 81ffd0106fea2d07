"""``python -m plumbwell``: the same command line as ``plumbwell``."""

import sys

try:
    from plumbwell.cli import main

    if __name__ == "__main__":
        sys.exit(main())
except KeyboardInterrupt:
    sys.exit(130)
