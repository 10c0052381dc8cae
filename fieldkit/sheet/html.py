"""A sheet as one HTML file: no script, nothing fetched, for screen and paper."""

from __future__ import annotations

from typing import Any

from fieldkit.sheet.content import Bullets, Document, Figure, Heading, Paragraph, Table
from fieldkit.sheet.plain import clean

MARK = "fieldkit sheet"
"""What tells a sheet from any other file, in its first lines."""


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
    return made.get_template("sheet.html")


def _svg(figure: Figure) -> Any:
    """The drawing as it is: its own texts were escaped by the library that wrote it."""
    from markupsafe import Markup

    return Markup(figure.svg)


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
