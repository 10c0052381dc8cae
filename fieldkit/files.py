"""Write files in one piece."""

from __future__ import annotations

import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import BinaryIO


def replace_file(path: Path, content: bytes) -> None:
    """Through a new file beside it, which takes its place only when it is safely written."""
    with replacing(path) as file:
        file.write(content)


@contextmanager
def replacing(path: Path) -> Iterator[BinaryIO]:
    """The same for what is too long for memory: a file to write, nothing replaced on an error."""
    beside = path.with_name(f".{path.name}.{secrets.token_hex(4)}")
    try:
        with beside.open("x+b") as file:
            yield file
            file.flush()
            os.fsync(file.fileno())
        if path.exists():
            beside.chmod(path.stat().st_mode & 0o7777)
        beside.replace(path)
    finally:
        with suppress(OSError):
            beside.unlink(missing_ok=True)
