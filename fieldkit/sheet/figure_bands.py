"""Modes now and after each change, beside the bands to avoid: the answer in one picture."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fieldkit.detune.verdict import Detuning, JudgedMode
from fieldkit.sheet.content import Figure
from fieldkit.sheet.drawing import (
    BAND,
    BAND_CORE,
    DIRECTION_COLOURS,
    INK,
    MUTED,
    direction_colour,
    drawn,
    svg_of,
)
from fieldkit.sheet.plain import clean, percent
from fieldkit.signal.modes import MeasuredMode

CHANGES_SHOWN = 4
ROW_IN = 0.3


def bands_figure(found: Detuning, measured: Sequence[MeasuredMode], up_to_hz: float) -> Figure:
    """One row for what was measured, one for now, one for each of the best changes."""
    rows: list[tuple[str, Sequence[JudgedMode]]] = [
        (f"now, {found.state} ({percent(found.chance_now)})", found.modes)
    ]
    rows += [
        (f"change {fix.rank} ({percent(fix.chance)})", fix.modes_after)
        for fix in found.fixes[:CHANGES_SHOWN]
    ]
    count = len(rows) + bool(measured)
    with drawn(0.75 + ROW_IN * count) as figure:
        axes = figure.subplots()
        figure.subplots_adjust(
            left=0.17, right=0.975, top=1 - 0.28 / figure.get_figheight(),
            bottom=0.38 / figure.get_figheight(),
        )  # fmt: skip
        axes.set_xlim(0, up_to_hz)
        axes.set_ylim(count - 0.4, -0.6)
        _shade(axes, found, up_to_hz)
        if measured:
            _points(axes, 0, measured)
        for row, (_, modes) in enumerate(rows, start=int(bool(measured))):
            _intervals(axes, row, modes)
        labels = ["measured"] * bool(measured) + [clean(name) for name, _ in rows]
        axes.set_yticks(range(count), labels)
        axes.tick_params(axis="y", length=0)
        axes.set_xlabel("frequency, Hz", loc="left")
        others = {mode.direction for mode in measured} - {*DIRECTION_COLOURS}
        _legend(axes, bool(others))
        shown = (
            "Modes beside the bands to avoid (shaded; the excitation itself darker): median as a "
            "dot, 5 to 95 % as a bar, now and after each of the best changes, in brackets the "
            "chance that all are clear"
        )
        return Figure(shown, svg_of(figure, "bands", shown))


def _shade(axes: Any, found: Detuning, up_to_hz: float) -> None:
    for band in found.bands:
        axes.axvspan(band.avoid_low_hz, band.avoid_high_hz, color=BAND, linewidth=0, zorder=0)
    last = float("-inf")
    for band in found.bands:
        axes.axvspan(
            band.low_hz, band.high_hz, color=BAND_CORE, linewidth=0.6, alpha=0.45, zorder=0.5
        )
        middle = (band.low_hz + band.high_hz) / 2
        if middle < up_to_hz and middle - last > 0.09 * up_to_hz:
            last = middle
            axes.annotate(
                clean(band.name), (middle, 1.0), (0, 3), xycoords=("data", "axes fraction"),
                textcoords="offset points", ha="center", va="bottom", fontsize=7, color=MUTED,
            )  # fmt: skip


def _points(axes: Any, row: int, modes: Sequence[MeasuredMode]) -> None:
    for mode in modes:
        colour = direction_colour(mode.direction)
        axes.plot([mode.frequency_hz], [row], "D", color=colour, markersize=3.8)


def _intervals(axes: Any, row: int, modes: Sequence[JudgedMode]) -> None:
    for mode in modes:
        colour = direction_colour(mode.direction)
        axes.plot(
            [mode.low_hz, mode.high_hz], [row, row], color=colour, linewidth=2.4,
            solid_capstyle="round", alpha=0.55,
        )  # fmt: skip
        axes.plot([mode.median_hz], [row], "o", color=colour, markersize=4.2)


def _legend(axes: Any, others: bool) -> None:
    from matplotlib.lines import Line2D

    kinds = [*DIRECTION_COLOURS.items(), *([("other", MUTED)] if others else [])]
    handles = [
        Line2D([], [], color=colour, marker="o", linewidth=2.4, markersize=4.2)
        for _, colour in kinds
    ]
    axes.legend(
        handles, [name for name, _ in kinds], loc="upper right", ncols=4,
        bbox_to_anchor=(1.0, -0.02), bbox_transform=axes.transAxes, borderaxespad=1.5,
        labelcolor=INK, handlelength=1.4,
    )  # fmt: skip
