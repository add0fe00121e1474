"""Everything at once: demands in every combination, commands on damaged files.

A solid sample runs by default; DESIGNER_DEEP=1 in the environment runs all of it.
"""

from __future__ import annotations

import os

DEEP = os.environ.get("DESIGNER_DEEP") == "1"
