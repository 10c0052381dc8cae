"""How the app looks: dark, light, high contrast, or no colour at all."""

from __future__ import annotations

from rich.color import Color as RichColor
from rich.segment import Segment
from rich.style import Style
from textual.app import App
from textual.color import Color
from textual.filter import LineFilter, Monochrome, NoColor
from textual.theme import Theme

STANDS_OUT = 0.25
"""Brightness from the ground beyond which a ground marks something, such as the cursor row."""
CONTRAST = Theme(
    name="fieldkit-contrast",
    primary="#5fd7ff",
    secondary="#ffaf5f",
    warning="#ffff00",
    error="#ff8787",
    success="#5fff87",
    accent="#ff87ff",
    foreground="#ffffff",
    background="#000000",
    surface="#000000",
    panel="#262626",
    dark=True,
    text_alpha=1.0,
    variables={"text-muted": "#d0d0d0", "text-disabled": "#b0b0b0"},
)
PLAIN = Theme(
    name="fieldkit-plain",
    primary="#a0a0a0",
    secondary="#ffffff",
    warning="#ffffff",
    error="#ffffff",
    success="#ffffff",
    accent="#ffffff",
    foreground="#ffffff",
    background="#000000",
    surface="#000000",
    panel="#000000",
    dark=True,
    text_alpha=1.0,
)
LOOKS = {
    "textual-dark": "Dark",
    "textual-light": "Light",
    CONTRAST.name: "High contrast",
    PLAIN.name: "No colour",
}
"""Themes in the order of the key, and what they are called."""
_DEFAULT = Style.from_color(RichColor.parse("default"), RichColor.parse("default"))


class ColourOff(LineFilter):
    """The terminal's own two colours; what stood out by its ground is reversed."""

    def apply(self, segments: list[Segment], background: Color) -> list[Segment]:
        """The same text without any colour."""
        return [
            Segment(text, style if style is None else _plain(style, background), control)
            for text, style, control in segments
        ]


def _plain(style: Style, background: Color) -> Style:
    ground = style.bgcolor
    marked = (
        ground is not None
        and not ground.is_default
        and abs(Color.from_rich_color(ground).brightness - background.brightness) > STANDS_OUT
    )
    turned = Style(reverse=True) if marked and not style.reverse else Style()
    return style + _DEFAULT + turned


def prepare(app: App[None]) -> None:
    """Make the looks known; a user who wants no colour gets none."""
    app.register_theme(CONTRAST)
    app.register_theme(PLAIN)
    if app.no_color:
        wear(app, PLAIN.name)


def wear(app: App[None], theme: str) -> None:
    """Put a look on."""
    kept = [f for f in app._filters if not isinstance(f, ColourOff | Monochrome | NoColor)]
    app._filters = [*kept, ColourOff()] if theme == PLAIN.name else kept
    app.theme = theme


def next_look(app: App[None]) -> str:
    """Put the next look on and say which."""
    names = list(LOOKS)
    here = names.index(app.theme) if app.theme in names else -1
    theme = names[(here + 1) % len(names)]
    wear(app, theme)
    return LOOKS[theme]
