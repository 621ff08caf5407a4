"""``python -m buckdesign`` and the console script."""

from __future__ import annotations

import sys


def main() -> None:
    """Run the program and leave with its exit status."""
    try:
        from buckdesign.cli.app import run
    except KeyboardInterrupt:
        sys.exit(130)
    sys.exit(run())


if __name__ == "__main__":
    main()
