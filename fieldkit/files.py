"""Write small files in one piece."""

from __future__ import annotations

import os
import secrets
from contextlib import suppress
from pathlib import Path


def replace_file(path: Path, content: bytes) -> None:
    """Through a new file beside it, which takes its place only when it is safely written."""
    beside = path.with_name(f".{path.name}.{secrets.token_hex(4)}")
    try:
        with beside.open("xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        if path.exists():
            beside.chmod(path.stat().st_mode & 0o7777)
        beside.replace(path)
    finally:
        with suppress(OSError):
            beside.unlink(missing_ok=True)
