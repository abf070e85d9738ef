"""``python -m deembed``."""

from __future__ import annotations

import sys

from deembed.job.command import main

if __name__ == "__main__":
    sys.exit(main())
