"""The oldest versions that pyproject.toml allows, as constraints: ``python -m tests.oldest``.

``pip install -c`` with them shows whether the lower bounds are true.
"""

from __future__ import annotations

import re
import sys
import tomllib
from pathlib import Path

PROJECT = Path(__file__).parents[1] / "pyproject.toml"
_LOWEST = re.compile(r"([\w.-]+)>=([\w.]+)")


def constraints() -> list[str]:
    """One line for each library the program itself needs."""
    needed = tomllib.loads(PROJECT.read_text("utf-8"))["project"]["dependencies"]
    found = [_LOWEST.match(line) for line in needed]
    assert all(found), needed
    return [f"{lowest[1]}=={lowest[2]}" for lowest in found if lowest]


if __name__ == "__main__":
    sys.stdout.write("\n".join(constraints()) + "\n")
