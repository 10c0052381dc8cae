"""What is marked along the span beside supports and masses: nodes, antinodes, sensors, taps."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING

from fieldkit.span.motion import TapPlace, antinodes, nodes, tap_place
from fieldkit.ui.widgets.span_art import Item
from fieldkit.ui.words import count, ratio_percent

if TYPE_CHECKING:
    from fieldkit.detune.excitation import Band
    from fieldkit.job.document import Job
    from fieldkit.span.layout import Span
    from fieldkit.span.modes import Mode

NODE, ANTINODE, SENSOR, STRUCK, TAP_HERE = "×", "◇", "□", "▼", "▽"
LEAST_MODES, MOST_MODES = 3, 6
SAME_PLACE = 0.02
"""Stations closer than this share of the length are one place."""
LengthText = Callable[[float], str]


def mode_items(mode: Mode | None, span: Span, length_text: LengthText) -> tuple[Item, ...]:
    """Where a mode moves most and where it stands still between the supports."""
    if mode is None:
        return ()
    held = [support.at_m for support in span.supports]
    most, *others = antinodes(mode) or (mode.where_m,)
    return (
        Item(most, ANTINODE, (f"most {length_text(most)}", "most"), "node"),
        *(Item(at, NODE, (f"node {length_text(at)}", "node"), "node") for at in nodes(mode, held)),
        *(Item(at, ANTINODE, (), "node") for at in others),
    )


def measuring_items(job: Job, place: TapPlace | None, length_text: LengthText) -> tuple[Item, ...]:
    """Where was tapped, where the sensor sat, and where a tap shows every mode."""
    near = SAME_PLACE * job.span.length_m
    taps = job.recordings_of("tap")
    sensors = _apart([entry.at_m for entry in taps if entry.at_m is not None], near)
    struck = _apart(
        [e.hammer.at_m for e in taps if e.hammer is not None and e.hammer.at_m is not None], near
    )
    items = [
        *(Item(at, SENSOR, (f"sensor {length_text(at)}", "sensor"), "sensor", 1) for at in sensors),
        *(Item(at, STRUCK, (f"struck {length_text(at)}", "struck"), "sensor", -1) for at in struck),
    ]
    if place is not None:
        words = (f"tap here {length_text(place.at_m)}", "tap here")
        items.insert(0, Item(place.at_m, TAP_HERE, words, "tap", -1))
    return tuple(items)


def _apart(stations: Sequence[float], near: float) -> list[float]:
    found: list[float] = []
    for at in sorted(stations):
        if not found or at - found[-1] > near:
            found.append(at)
    return found


def modes_of_interest(modes: Sequence[Mode], bands: Sequence[Band]) -> tuple[Mode, ...]:
    """The lowest modes, up to the highest band: three at least, six at most."""
    highest = max((band.avoid_high_hz for band in bands), default=0.0)
    below = sum(mode.frequency_hz <= highest for mode in modes)
    return tuple(modes[: min(MOST_MODES, max(LEAST_MODES, below))])


def place_to_tap(modes: Sequence[Mode], job: Job, bands: Sequence[Band]) -> TapPlace | None:
    """Where a tap shows every mode of interest of the tapped state."""
    return tap_place(modes_of_interest(modes, bands), job.goal.keep_out_m)


def tap_words(place: TapPlace, length_text: LengthText) -> str:
    """The suggestion with its reason."""
    where = f"Tap at {length_text(place.at_m)}, sensor beside it"
    of = f"the {count(place.modes, 'lowest mode')}" if place.modes > 1 else "the lowest mode"
    if place.shows_all:
        return (
            f"{where}: {of} move there, mode {place.weakest} least ({ratio_percent(place.share)})."
        )
    return (
        f"{where}: the best there is, yet mode {place.weakest} hardly moves there "
        f"({ratio_percent(place.share)}); tap a second place for it."
    )
