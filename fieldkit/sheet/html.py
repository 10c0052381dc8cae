"""A sheet as one HTML file: no script, nothing fetched, for screen and paper."""

from __future__ import annotations

from typing import Any

from fieldkit.sheet.content import Bullets, Document, Figure, Heading, Paragraph, Table
from fieldkit.sheet.plain import clean

MARK = "fieldkit sheet"
"""What tells a sheet from any other file, in its first lines."""
HASH_LENGTH, LONGEST_WORD = 64, 22


def html(document: Document) -> str:
    """The whole page; every text is escaped by the template."""
    return str(_template().render(document=document, mark=MARK))


def _template() -> Any:
    from jinja2 import Environment, PackageLoader, StrictUndefined

    made = Environment(
        loader=PackageLoader("fieldkit.sheet", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    made.filters["plain"] = clean
    made.filters["svg"] = _svg
    made.filters["kind"] = _kind
    made.filters["looks"] = _looks
    return made.get_template("sheet.html")


def _svg(figure: Figure) -> Any:
    """The drawing as it is: its own texts were escaped by the library that wrote it."""
    from markupsafe import Markup

    return Markup(figure.svg)


def _looks(cell: str, to_right: bool) -> Any:
    """The class of a cell: a number, a hash, or text with words that must be broken."""
    from markupsafe import Markup

    if to_right:
        return Markup(' class="number"')
    longest = max(map(len, cell.split()), default=0)
    if longest == HASH_LENGTH and cell.isalnum():
        return Markup(' class="hash"')
    return Markup(' class="long"') if longest > LONGEST_WORD else ""


def _kind(block: object) -> str:
    """Which macro draws a block."""
    kinds = {
        Paragraph: "paragraph",
        Bullets: "bullets",
        Table: "table",
        Figure: "figure",
        Heading: "heading",
    }
    return kinds[type(block)]
