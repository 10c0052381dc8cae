"""A sheet as Markdown: the content of the HTML, with figures told by their captions."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence

from fieldkit.sheet.content import (
    CAUTION,
    FORMULA,
    Block,
    Bullets,
    Document,
    Figure,
    Heading,
    Paragraph,
    Section,
    Table,
)
from fieldkit.sheet.html import MARK
from fieldkit.sheet.plain import clean

IN_HTML = "drawn in the HTML sheet"
_SPECIAL = re.compile(r"([\\`*_\[\]<>|~&$])")
_LINE_START = re.compile(r"^(\s*)(#{1,6}(?=\s|$)|[-+=](?=[\s=-]|$)|:(?=\s))")
_NUMBERED = re.compile(r"^(\s*\d+)([.)])(?=\s|$)")


def markdown(document: Document) -> str:
    """The whole text; what would be markup in a text of the job is escaped."""
    facts = ", ".join(f"{name} {plain(value)}" for name, value in document.facts)
    parts = [f"<!-- {MARK} -->", f"# {plain(document.title)}", facts]
    parts += [f"**{plain(notice)}**" for notice in document.notices]
    for number, part in enumerate(document.sections, start=1):
        parts += _section(number, part)
    return "\n\n".join(parts) + "\n"


def plain(text: str) -> str:
    """Text in which nothing is read as markup or as a link."""
    escaped = _SPECIAL.sub(r"\\\1", clean(text))
    escaped = escaped.replace("://", ":\\/\\/").replace("www.", "www\\.").replace("@", "\\@")
    escaped = _LINE_START.sub(r"\1\\\2", escaped)
    return _NUMBERED.sub(r"\1\\\2", escaped)


def _section(number: int, part: Section) -> list[str]:
    return [f"## {number} {plain(part.title)}", *(_block(block) for block in part.blocks)]


def _block(block: Block) -> str:
    return _RENDER[type(block)](block)


def _paragraph(block: Paragraph) -> str:
    text = plain(block.text)
    return f"> {text}" if block.kind in (CAUTION, FORMULA) else text


def _bullets(block: Bullets) -> str:
    return "\n".join(f"- {plain(item)}" for item in block.items)


def _table(block: Table) -> str:
    rule = ["---:" if right else "---" for right in block.to_right]
    rows = [_row(block.head), "| " + " | ".join(rule) + " |", *map(_row, block.rows)]
    title = f"**{plain(block.title)}**\n\n" if block.title else ""
    return title + "\n".join(rows)


def _row(cells: Sequence[str]) -> str:
    return "| " + " | ".join(plain(cell) for cell in cells) + " |"


def _figure(block: Figure) -> str:
    return f"*Figure, {IN_HTML}: {plain(block.caption)}.*"


def _heading(block: Heading) -> str:
    return f"### {plain(block.text)}"


_RENDER: dict[type, Callable[..., str]] = {
    Paragraph: _paragraph,
    Bullets: _bullets,
    Table: _table,
    Figure: _figure,
    Heading: _heading,
}
