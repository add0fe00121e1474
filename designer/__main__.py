"""`python -m designer`, the same as `designer`."""

from __future__ import annotations

from designer.cli import main

if __name__ == "__main__":
    main()
