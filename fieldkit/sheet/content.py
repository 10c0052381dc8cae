"""What a sheet holds, before anybody decides how it looks: HTML and Markdown both render this.

Every text is plain: nothing in it is markup, whatever it contains.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from fieldkit.sheet.plain import Cells, numeric

PLAIN, FORMULA, CAUTION = "plain", "formula", "caution"
NUMBER_WIDTH = 14


@dataclass(frozen=True)
class Paragraph:
    """One paragraph."""

    text: str
    kind: str = PLAIN


@dataclass(frozen=True)
class Bullets:
    """A list of sentences."""

    items: tuple[str, ...]
    kind: str = PLAIN


@dataclass(frozen=True)
class Table:
    """A table with its title."""

    title: str
    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    keyed: bool = False
    """Whether the first column names what the others say."""

    @property
    def to_right(self) -> tuple[bool, ...]:
        """Which columns hold numbers, with no more than their unit."""
        short = [max((len(row[i]) for row in self.rows), default=0) for i in range(len(self.head))]
        return tuple(
            numeric(self.rows, i) and width <= NUMBER_WIDTH for i, width in enumerate(short)
        )


@dataclass(frozen=True)
class Figure:
    """A drawing: SVG that a library wrote, and what is to be seen in it."""

    caption: str
    svg: str


@dataclass(frozen=True)
class Heading:
    """A title within a section."""

    text: str


Block = Paragraph | Bullets | Table | Figure | Heading


@dataclass(frozen=True)
class Section:
    """A titled part of a sheet."""

    title: str
    blocks: tuple[Block, ...]


@dataclass(frozen=True)
class Document:
    """A whole sheet."""

    title: str
    facts: tuple[tuple[str, str], ...]
    """Name and value of what stands under the title."""
    notices: tuple[str, ...]
    """What must be read before anything else."""
    sections: tuple[Section, ...]
    program: str
    """Name and version."""


def table(title: str, cells: Cells, *, keyed: bool = False) -> Table:
    """A table of cells that the text renderings share."""
    return Table(title, tuple(cells.head), tuple(tuple(row) for row in cells.rows), keyed)


def bullets(items: Iterable[str], kind: str = PLAIN) -> list[Block]:
    """A list, or nothing where there is nothing to list."""
    found = tuple(items)
    return [Bullets(found, kind)] if found else []


def paragraphs(texts: Iterable[str], kind: str = PLAIN) -> list[Block]:
    """One paragraph each, begun with a capital and ended as a sentence."""
    return [Paragraph(sentence(text), kind) for text in texts if text]


def section(title: str, blocks: Sequence[Block]) -> Section:
    """A titled part; its blocks in order."""
    return Section(title, tuple(blocks))


def sentence(text: str) -> str:
    """With a capital and a full stop."""
    if not text:
        return text
    return text[0].upper() + text[1:] + ("" if text[-1] in ".:!?" else ".")
