"""SVG of a figure, in colours that the page decides: light, dark or printed.

A library draws; here stand only its settings and what is taken off its output.
"""

from __future__ import annotations

import io
import logging
import re
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from html import escape
from typing import TYPE_CHECKING, Any

from fieldkit.sheet.plain import clean

if TYPE_CHECKING:
    from matplotlib.figure import Figure

WIDTH_IN = 7.0
INK, MUTED, GRID, PAPER = "#010101", "#020202", "#030303", "#040404"
FIRST, SECOND, THIRD, BAND, BAND_CORE = "#050505", "#060606", "#070707", "#080808", "#090909"
COLOURS = {
    INK: ("ink", "#1c2227"),
    MUTED: ("muted", "#5b6670"),
    GRID: ("grid", "#dfe4e8"),
    PAPER: ("paper", "#ffffff"),
    FIRST: ("first", "#0b5fa5"),
    SECOND: ("second", "#b4530a"),
    THIRD: ("third", "#2b7a3d"),
    BAND: ("band", "#f6dcd7"),
    BAND_CORE: ("band-core", "#cf5a4a"),
}
"""What is drawn in, the name the page knows it by, and the colour where the page says nothing."""
DIRECTION_COLOURS = {"vertical": FIRST, "lateral": SECOND, "axial": THIRD}

_SETTINGS: Any = {
    "svg.fonttype": "none",
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 8.0,
    "text.parse_math": False,
    "text.usetex": False,
    "axes.formatter.use_mathtext": False,
    "text.color": INK,
    "axes.labelcolor": INK,
    "axes.edgecolor": MUTED,
    "axes.titlecolor": INK,
    "axes.titlesize": 8.5,
    "axes.titlelocation": "left",
    "axes.facecolor": "none",
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "xtick.color": MUTED,
    "ytick.color": MUTED,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "grid.color": GRID,
    "grid.linewidth": 0.6,
    "axes.axisbelow": True,
    "lines.linewidth": 1.0,
    "legend.frameon": False,
    "legend.fontsize": 7.5,
}


@contextmanager
def drawn(height_in: float) -> Iterator[Figure]:
    """An empty figure of the page's width, drawn with the settings of the sheet."""
    import matplotlib as mpl
    from matplotlib.figure import Figure

    logging.getLogger("matplotlib").setLevel(logging.ERROR)
    with mpl.rc_context(_SETTINGS), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        yield Figure(figsize=(WIDTH_IN, height_in), facecolor="none")


def svg_of(figure: Figure, name: str, told: str) -> str:
    """The figure as one ``svg`` element; ``name`` keeps its ids apart from other figures'.

    ``told`` says in words what is to be seen. The same figure gives the same text every time.
    """
    import matplotlib as mpl

    out = io.StringIO()
    with mpl.rc_context({"svg.hashsalt": f"fieldkit {name}"}):
        figure.savefig(out, format="svg", metadata=dict.fromkeys(_METADATA))
    return _for_page(out.getvalue(), told)


_METADATA = ("Date", "Creator", "Format", "Type")


def _for_page(text: str, told: str) -> str:
    """Without what belongs to a file of its own, and with the page's colours."""
    text = text[text.index("<svg") :]
    text = re.sub(r"\s*<metadata>.*?</metadata>", "", text, flags=re.DOTALL)
    text = re.sub(r"\s*<defs>\s*<style[^>]*>.*?</style>\s*</defs>", "", text, flags=re.DOTALL)
    text = re.sub(r'<g id="[^"]*"', "<g", text)
    box = re.search(r'viewBox="[^"]*"', text)
    assert box is not None
    label = escape(clean(told), quote=True)
    body = re.sub(r'style="[^"]*"', _in_page_colours, text[text.index(">") :])
    return f'<svg {_NAMES} {box[0]} role="img" aria-label="{label}"{body.rstrip()}'


_NAMES = 'xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink"'


def _in_page_colours(style: re.Match[str]) -> str:
    found = style[0]
    for colour, (name, otherwise) in COLOURS.items():
        found = found.replace(colour, f"var(--{name}, {otherwise})")
    return found


def direction_colour(direction: str | None) -> str:
    """The colour of a direction."""
    return DIRECTION_COLOURS.get((direction or "").partition("+")[0], MUTED)


def plain_logarithm(axis: Any) -> None:
    """Powers of ten as plain text: no markup of its own is read in any label."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    axis.set_major_locator(LogLocator(base=10, numticks=7))
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axis.set_minor_formatter(NullFormatter())
