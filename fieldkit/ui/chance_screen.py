"""The chance map over the Detune view: every place and size at once, and what any of them does."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, ClassVar

from rich.style import Style
from rich.text import Text
from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen
from textual.widget import Widget
from textual.widgets import Static
from textual.worker import get_current_worker

from fieldkit.errors import FieldkitError
from fieldkit.sheet.chance import (
    CURSOR,
    CURVE,
    KEPT_OUT,
    ZONE,
    axis_labels,
    best_at,
    headline,
    legend,
    picture,
    read_out,
    spread,
    station_text,
)
from fieldkit.ui.words import hertz, safe, sentence

if TYPE_CHECKING:
    from fieldkit.detune.candidates import Search
    from fieldkit.detune.chance_map import ChanceMap
    from fieldkit.detune.matched import Match
    from fieldkit.detune.verdict import Verdict  # noqa: F401  (named in a string below)
    from fieldkit.job.document import Job

DIRECTIONS = ("both", "vertical", "lateral")
KEYS = "←→ place · ↑↓ size · d holds · k support/mass · home best · enter adopt"
COUNTING = "Counting every place and size..."
SHOWN_MODES = 6


class MapDrawing(Widget):
    """The map with its axes and a cursor."""

    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"map--{name}" for name in ("shade", "zone", "curve", "kept-out", "cursor", "axis")
    }
    DEFAULT_CSS = """
    MapDrawing {
        height: 1fr; min-height: 6;
        & > .map--shade { color: $text-muted; }
        & > .map--zone { color: $text-success; text-style: bold; }
        & > .map--curve { color: $text-accent; text-style: bold; }
        & > .map--kept-out { color: $text-error; }
        & > .map--cursor { color: $text-warning; text-style: bold reverse; }
        & > .map--axis { color: $text-muted; }
    }
    """

    def __init__(self) -> None:
        super().__init__(id="map-drawing")
        self.found: ChanceMap | None = None
        self.at = (0, 0)
        self.units = "SI"

    def show(self, found: ChanceMap | None, at: tuple[int, int], units: str) -> None:
        """Another map, or the cursor at another place."""
        self.found, self.at, self.units = found, at, units
        self.refresh()

    def render(self) -> Text:
        """The picture at the size there is."""
        found = self.found
        if found is None:
            return Text(COUNTING, style=self._style("axis"))
        rows = max(2, self.size.height - 1)
        labels = axis_labels(found, rows, self.units)
        width = max(map(len, labels))
        columns = max(8, self.size.width - width - 3)
        lines = [list(line) for line in picture(found, rows, columns)]
        across, up = spread(len(found.station_m), columns), spread(len(found.size), rows)[::-1]
        row = int(abs(up - self.at[1]).argmin())
        column = int(abs(across - self.at[0]).argmin())
        lines[row][column] = CURSOR
        text = Text(no_wrap=True)
        for label, line in zip(labels, lines, strict=True):
            text.append(f"{label:>{width}} ┤", style=self._style("axis"))
            for glyph in line:
                text.append(glyph, style=self._style(_KINDS.get(glyph, "shade")))
            text.append("\n")
        end = station_text(float(found.station_m[-1]), self.units)
        start = station_text(0.0, self.units)
        gap = max(1, columns - len(start) - len(end))
        text.append(" " * (width + 2) + start + " " * gap + end, style=self._style("axis"))
        return text

    def _style(self, name: str) -> Style:
        return self.get_component_rich_style(f"map--{name}", partial=True)


_KINDS = {ZONE: "zone", CURVE: "curve", KEPT_OUT: "kept-out", CURSOR: "cursor"}


class ChanceScreen(ModalScreen["Verdict | None"]):
    """The map, a read-out that follows the cursor, and the change under it to adopt."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q", "dismiss", "Close", priority=True, id="map.close"),
        Binding("left", "move(-1, 0)", "Station", id="map.left"),
        Binding("right", "move(1, 0)", "Station", id="map.right"),
        Binding("shift+left", "move(-6, 0)", "Station", show=False, id="map.far-left"),
        Binding("shift+right", "move(6, 0)", "Station", show=False, id="map.far-right"),
        Binding("up", "move(0, 1)", "Size", id="map.up"),
        Binding("down", "move(0, -1)", "Size", id="map.down"),
        Binding("home", "best", "Best", id="map.best", tooltip="The least that does it"),
        Binding("d", "direction", "Direction", id="map.direction"),
        Binding("k", "kind", "Support or mass", id="map.kind"),
        Binding("enter,a", "adopt", "Adopt", id="map.adopt"),
    ]

    def __init__(self, job: Job, matched: Match | None) -> None:
        super().__init__()
        self.job = job
        self.matched = matched
        self.kind, self.direction = "support", "both"
        self.at = (0, 0)
        self.found: ChanceMap | None = None
        self.search: Search | None = None

    def compose(self) -> ComposeResult:
        """Title, map, read-out, legend, keys."""
        with Vertical(classes="window response-window"):
            yield Static("", markup=False, id="map-title", classes="window-title")
            yield MapDrawing()
            yield Static("", markup=False, id="map-legend", classes="hint")
            yield Static("", markup=False, id="map-words")
            yield Static("", markup=False, id="map-modes")
            yield Static(KEYS, markup=False, classes="hint")

    def on_mount(self) -> None:
        """Count the first map."""
        self.count()

    @work(thread=True, exclusive=True, exit_on_error=False, group="map")
    def count(self) -> None:
        """Count the map of the kind and direction asked for."""
        from fieldkit.detune.chance_map import chance_map
        from fieldkit.workup.chance import search_of

        worker, kind, direction = get_current_worker(), self.kind, self.direction
        try:
            search = self.search or search_of(self.job, self.matched)
            found = chance_map(search, kind, direction)
        except FieldkitError as error:
            self.app.call_from_thread(self.refuse, str(error))
            return
        if not worker.is_cancelled:
            self.app.call_from_thread(self.take, search, found)

    def take(self, search: Search, found: ChanceMap) -> None:
        """Show a counted map; a new kind of it starts at the least that does it."""
        other = self.found is None or self.found.kind != found.kind
        self.search, self.found = search, found
        if other:
            self.at = best_at(found)
        self.at = (self.at[0], min(self.at[1], len(found.size) - 1))
        self.query_one("#map-title", Static).update(safe(headline(found)))
        self.query_one("#map-legend", Static).update(safe(legend(found)))
        self._read()

    def refuse(self, reason: str) -> None:
        """Why there is no map."""
        self.query_one("#map-words", Static).update(safe(sentence(reason)))

    def action_move(self, stations: int, sizes: int) -> None:
        """The cursor to another place."""
        if self.found is None:
            return
        n, m = self.found.chance.shape
        i, j = self.at
        self.at = (min(max(i + stations, 0), n - 1), min(max(j + sizes, 0), m - 1))
        self._read()

    def action_best(self) -> None:
        """The cursor to the least that does it."""
        if self.found is not None:
            self.at = best_at(self.found)
            self._read()

    def action_direction(self) -> None:
        """Hold another direction."""
        self.direction = DIRECTIONS[(DIRECTIONS.index(self.direction) + 1) % len(DIRECTIONS)]
        self.kind = "support"
        self.count()

    def action_kind(self) -> None:
        """Supports or masses."""
        self.kind = "mass" if self.kind == "support" else "support"
        self.count()

    @work(thread=True, exclusive=True, exit_on_error=False, group="map-adopt")
    def action_adopt(self) -> None:
        """Re-solve the change under the cursor in full and hand it over."""
        from fieldkit.detune.rank import afresh, judged_change

        if self.found is None or self.search is None:
            return
        if self.found.kept_out[self.at[0]]:
            self.app.call_from_thread(self.notify, "Kept out here.", severity="warning")
            return
        change, job = self.found.change(*self.at), self.job
        verdict = judged_change(
            afresh(self.search, self.matched), job.tapped, job.running, change, job.units
        )
        self.app.call_from_thread(self.dismiss, replace(verdict, rank=0))

    def _read(self) -> None:
        assert self.found is not None
        self.query_one(MapDrawing).show(self.found, self.at, self.job.units)
        words = read_out(self.found, *self.at, self.job.units)
        self.query_one("#map-words", Static).update(safe(words))
        self.what_if()

    @work(thread=True, exclusive=True, exit_on_error=False, group="map-what-if")
    def what_if(self) -> None:
        """The modes with the change under the cursor."""
        from fieldkit.detune import judge

        worker, search, found, at = get_current_worker(), self.search, self.found, self.at
        if search is None or found is None:
            return
        up_to_hz = search.goal.up_to_hz
        spectrum = judge.after(search.field, search.push(found.change(*at)), up_to_hz)
        modes = judge.judged_modes(spectrum, search.bands, up_to_hz)
        shown = ", ".join(hertz(mode.median_hz) for mode in modes[:SHOWN_MODES])
        if not worker.is_cancelled:
            text = f"modes then {shown} Hz"
            self.app.call_from_thread(self.query_one("#map-modes", Static).update, safe(text))
