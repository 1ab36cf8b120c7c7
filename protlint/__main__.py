"""``python -m protlint`` is the command ``protlint``."""

from __future__ import annotations

from protlint.cli import main

if __name__ == "__main__":
    main()
