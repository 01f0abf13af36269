"""python -m pvfeas, and the console script."""

from __future__ import annotations

from pvfeas.cli import main

if __name__ == "__main__":
    main()

__all__ = ["main"]
