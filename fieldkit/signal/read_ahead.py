"""Work on one block while the next one is read."""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from typing import TypeVar

Item = TypeVar("Item")


def ahead(items: Iterator[Item]) -> Iterator[Item]:
    """The items in their order, each fetched in a thread while the one before is worked on.

    Decoding and transforms let go of the interpreter, so that an hour of audio takes hardly longer
    than the slower of the two. What the iterator raises comes out in its place.
    """
    nothing = object()
    with ThreadPoolExecutor(1) as reader:
        coming = reader.submit(next, items, nothing)
        while (item := coming.result()) is not nothing:
            coming = reader.submit(next, items, nothing)
            yield item  # type: ignore[misc]
