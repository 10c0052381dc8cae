"""The widget under every drawing: a canvas shown through the line API."""

from __future__ import annotations

from rich.segment import Segment
from rich.style import Style
from textual.geometry import Region
from textual.reactive import reactive
from textual.strip import Strip
from textual.widget import Widget

from fieldkit.ui.widgets.glyphs import plain_terminal
from fieldkit.ui.widgets.raster import Canvas, Run


class Drawing(Widget):
    """Draws itself on a canvas once per change and hands out its lines.

    A subclass fills ``draw`` and names its inks and grounds in COMPONENT_CLASSES with the prefix
    ``COMPONENT_PREFIX``: ink ``mode`` is styled by the class ``<prefix>--mode``.
    """

    COMPONENT_PREFIX = "drawing"

    plain: reactive[bool] = reactive(plain_terminal)
    """Keep to ASCII."""

    def __init__(
        self, *, name: str | None = None, id: str | None = None, classes: str | None = None
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self._lines: list[Strip] | None = None
        self._drawn_size = (-1, -1)
        self._base = Style()
        self._looks: dict[tuple[str, str], Style] = {}

    def draw(self, canvas: Canvas) -> None:
        """Fill the canvas, which is as large as the content area."""
        raise NotImplementedError

    def redraw(self) -> None:
        """Forget the picture; it is drawn again when the screen asks for it."""
        self._lines = None
        self.refresh()

    def notify_style_update(self) -> None:
        """Colours changed: look them up again."""
        super().notify_style_update()
        self._lines = None

    def watch_plain(self) -> None:
        """Draw with the other set of glyphs."""
        self.redraw()

    def render_lines(self, crop: Region) -> list[Strip]:
        """The lines of a region; drawn anew where the ground underneath has changed colour."""
        if self.rich_style != self._base:
            self._lines = None
        return super().render_lines(crop)

    def render_line(self, y: int) -> Strip:
        """One line of the picture."""
        size = (self.size.width, self.size.height)
        if self._lines is None or self._drawn_size != size:
            self._lines = self._painted(Canvas(*size))
            self._drawn_size = size
        return self._lines[y] if y < len(self._lines) else Strip.blank(size[0], self._base)

    def _painted(self, canvas: Canvas) -> list[Strip]:
        self._base = self.rich_style
        self._looks = {("", ""): self._base}
        self.draw(canvas)
        return [self._strip(runs) for runs in canvas.runs(plain=self.plain)]

    def _strip(self, runs: list[Run]) -> Strip:
        segments = [Segment(run.text, self._look(run.ink, run.ground)) for run in runs]
        return Strip(segments, self.size.width)

    def _look(self, ink: str, ground: str) -> Style:
        """The style of an ink on a ground, looked up once per picture."""
        look = self._looks.get((ink, ground))
        if look is None:
            look = self._component(ink)
            if ground and look.bgcolor == self._base.bgcolor:
                look += Style(bgcolor=self._component(ground).bgcolor)
            self._looks[ink, ground] = look
        return look

    def _component(self, name: str) -> Style:
        if not name:
            return self._base
        return self.get_component_rich_style(f"{self.COMPONENT_PREFIX}--{name}")


def write_empty(canvas: Canvas, sentence: str, ink: str = "note") -> None:
    """A sentence in the middle of an empty drawing, wrapped to its width."""
    lines = _wrapped(sentence, max(1, canvas.columns - 2))[: canvas.rows]
    top = (canvas.rows - len(lines)) // 2
    for row, line in enumerate(lines, start=top):
        canvas.write(row, max(0, (canvas.columns - len(line)) // 2), line, ink)


def _wrapped(sentence: str, width: int) -> list[str]:
    lines = [""]
    for word in sentence.split():
        longer = f"{lines[-1]} {word}".strip()
        if len(longer) <= width:
            lines[-1] = longer
        else:
            lines.append(word)
    return lines
