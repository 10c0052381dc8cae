"""The chance of every place and size of one kind of change, counted over the whole ensemble.

One picture instead of a search: station across, stiffness or mass up, and why what does not work
does not. k*(x) is the stiffness that brings the mode in question to the edge of its band at a
station, -1/G there; for a mass it is 1/(w^2 G).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.candidates import Search, equal_rows, stiffness_along
from fieldkit.detune.fixes import AddMass, AddSupport, Change
from fieldkit.detune.push import EVERY_WAY
from fieldkit.detune.screen import Count, Counter, left_in, merged
from fieldkit.detune.why import interval_name

Array = NDArray[np.float64]
Index = NDArray[np.intp]

STATIONS, SIZES = 60, 40
DIRECTIONS = {
    "vertical": ("vertical",),
    "lateral": ("lateral",),
    "both": ("vertical", "lateral"),
}
KINDS = ("support", "mass")
NODE_SHARE = 0.12
"""A mode that moves less than this share of its largest motion stands nearly still there."""
OTHER_WAY_SHARE = 0.2
"""A mode whose largest motion along the held directions is less than this share of its motion."""
RIGID_HZ = 0.2


@dataclass(frozen=True)
class ChanceMap:
    """n stations across, m sizes up."""

    kind: str
    """``support`` or ``mass``."""
    direction: str
    """``vertical``, ``lateral`` or ``both``; what a support holds. Empty for a mass."""
    station_m: Array
    """(n,)"""
    size: Array
    """(m,) N/m or kg, rising."""
    chance: Array
    """(n, m) that every band is clear, as-installed scatter included."""
    wanted: float
    curve: Array
    """(n,) the size that brings the mode in question to its band's edge; NaN where none does."""
    mode: int
    """The mode in question, from 1: the one most often in a band now; 0 where none is."""
    band: str
    """The band it lies in."""
    kept_out: NDArray[np.bool_]
    """(n,) the job forbids a change there."""
    limit_mode: Index
    """(n, m) the mode most often found in a band, from 1; 0 where none ever is."""
    limit_band: Index
    """(n, m) which of ``bands``."""
    limit_chance: Array
    """(n, m) of that band alone being empty."""
    bands: tuple[str, ...]
    newcomer: NDArray[np.bool_]
    """(n, m) whether the change itself brings that mode into the band."""
    caught: tuple[tuple[int, ...], ...]
    """By band, the modes of the middle member that lie in it now, from 1."""
    still: NDArray[np.bool_]
    """(modes, n) where a mode hardly moves along what is held."""
    other_way: NDArray[np.bool_]
    """(modes,) whether a mode moves across what is held everywhere."""

    @property
    def zone(self) -> NDArray[np.bool_]:
        """(n, m) where the wanted chance is reached and something may be attached."""
        return np.asarray((self.chance >= self.wanted) & ~self.kept_out[:, None])

    def words(self, i: int, j: int) -> str:
        """Why station i with size j works, or why it cannot."""
        if self.kept_out[i]:
            return "kept out"
        mode, band = int(self.limit_mode[i, j]), self.bands[int(self.limit_band[i, j])]
        if mode == 0:
            return "no mode comes near a band"
        if self.chance[i, j] >= self.wanted:
            return f"clear; mode {mode} is the nearest to {band}"
        if self.newcomer[i, j]:
            verb = "raises" if self.kind == "support" else "drops"
            return f"{verb} mode {mode} into {band}"
        for own in self.caught[int(self.limit_band[i, j])]:
            if self.other_way[own - 1]:
                return f"mode {own} moves another way: it stays in {band}"
            if self.still[own - 1, i]:
                return f"node of mode {own}: it stays in {band}"
        if not np.any(self.chance[i, j:] >= self.wanted):
            return f"mode {mode} stays in {band}, whatever the size here"
        more = "too soft" if self.kind == "support" else "too light"
        return f"{more}: mode {mode} stays in {band}"

    def change(self, i: int, j: int) -> Change:
        """The change that a place on the map means."""
        at_m, size = round(float(self.station_m[i]), 3), float(f"{self.size[j]:.2g}")
        if self.kind == "mass":
            return AddMass(at_m, size)
        return AddSupport(at_m, **stiffness_along(DIRECTIONS[self.direction], size))


def chance_map(
    search: Search,
    kind: str = "support",
    direction: str = "both",
    stations: int = STATIONS,
    sizes: int = SIZES,
) -> ChanceMap:
    """Count every station with every size.

    ``direction`` is what a support holds, of DIRECTIONS; a mass is carried every way.
    """
    axes = DIRECTIONS[direction] if kind == "support" else EVERY_WAY
    places = [float(x) for x in np.linspace(0.0, search.span.length_m, stations)]
    levels = search.stiffness_levels(sizes) if kind == "support" else search.mass_levels(sizes)
    count = search.counter()
    intervals = merged(search.bands, search.goal.up_to_hz)
    rigid = _rigid(search)
    shape = (stations, len(levels))
    chance, band_chance = np.ones(shape), np.ones(shape)
    limit_mode, limit_band = np.zeros(shape, np.intp), np.zeros(shape, np.intp)
    newcomer = np.zeros(shape, dtype=bool)
    curve = np.full(stations, np.nan)
    worst, blocked_now = _worst(count.base)
    for own_m, receptance in equal_rows(search, axes, places):
        own = np.searchsorted(places, own_m)
        for j, level in enumerate(levels):
            after = _after(search, count, kind, receptance, float(level))
            free = left_in(after) == 0
            chance[own, j] = _share(search, free.all(axis=-1))
            by_band = _share(search, np.moveaxis(free, -1, 0))
            which = np.argmin(by_band, axis=0) if len(intervals) else np.zeros(len(own), np.intp)
            limit_band[own, j] = which
            if not len(intervals):
                continue
            band_chance[own, j] = by_band[which, np.arange(len(own))]
            mode, new = _limiting(count.base, after, which)
            limit_mode[own, j] = np.where(mode > 0, np.maximum(mode - rigid, 1), 0)
            newcomer[own, j] = new
        if blocked_now:
            curve[own] = _curve(count, kind, receptance, worst)
    still, other_way = _motions(search, axes, places, rigid)
    return ChanceMap(
        kind=kind,
        direction=direction if kind == "support" else "",
        station_m=np.array(places),
        size=np.asarray(levels, dtype=float),
        chance=chance,
        wanted=search.goal.chance,
        curve=curve,
        mode=_mode_in(count.base, worst, rigid) if blocked_now else 0,
        band=interval_name(intervals[worst], search.bands) if blocked_now else "",
        kept_out=np.array([not search.goal.may_attach(x) for x in places]),
        limit_mode=limit_mode,
        limit_band=limit_band,
        limit_chance=band_chance,
        bands=tuple(interval_name(interval, search.bands) for interval in intervals) or ("",),
        newcomer=newcomer,
        caught=_caught(search, intervals, rigid) or ((),),
        still=still,
        other_way=other_way,
    )


def _share(search: Search, clear: NDArray[np.bool_]) -> Array:
    """(...) chance from (..., members), the Jeffreys estimate."""
    if search.pick is not None:
        clear = clear[..., search.pick]
    return np.asarray((clear.sum(axis=-1) + 0.5) / (clear.shape[-1] + 1))


def _after(search: Search, count: Counter, kind: str, receptance: Array, level: float) -> Count:
    if kind == "support":
        return count.with_springs(receptance, level * search.scatter.stiffness_factor)
    return count.with_masses(receptance, np.full(search.field.members, level))


def _worst(base: Count) -> tuple[int, bool]:
    """The interval that holds a mode in most members now, and whether any does."""
    if not base.shape[1]:
        return 0, False
    blocked = (left_in(base) > 0).mean(axis=0)
    return int(np.argmax(blocked)), bool(blocked.max() > 0)


def _limiting(base: Count, after: Count, which: Index) -> tuple[Index, NDArray[np.bool_]]:
    """(stations,) number of the mode most often in the chosen interval after the change, counted
    with rigid ones, 0 where none ever is; and whether it mostly was not in it before."""
    low = after[np.arange(len(which)), :, 2 * which]
    high = after[np.arange(len(which)), :, 2 * which + 1]
    inside = high > low
    total = inside.sum(axis=1)
    number = np.where(inside, low + 1, 0).sum(axis=1) / np.maximum(total, 1)
    was = (low + 1 > base[:, 2 * which].T) & (low + 1 <= base[:, 2 * which + 1].T)
    new = (inside & ~was).sum(axis=1) > 0.5 * total
    return np.rint(number).astype(np.intp), np.asarray(new & (total > 0))


def _curve(count: Counter, kind: str, receptance: Array, worst: int) -> Array:
    """(stations,) median over the members of the size that empties the interval one way: springs
    lift its modes above it, masses bring them below."""
    edge = 2 * worst + (1 if kind == "support" else 0)
    g = receptance[..., edge, :]
    with np.errstate(divide="ignore"):
        if kind == "support":
            size = np.where(g < 0, -1 / g, np.inf)
        else:
            size = np.where(g > 0, 1 / (count.edge_rad_per_s[edge] ** 2 * g), np.inf)
    size = np.sort(size, axis=-1)
    held = left_in(count.base)[:, worst]
    needed = np.clip(held - 1, 0, size.shape[-1] - 1)
    chosen = np.take_along_axis(
        size, np.broadcast_to(needed[None, :, None], (*size.shape[:2], 1)), axis=-1
    )[..., 0]
    chosen = np.where(held[None] > size.shape[-1], np.inf, chosen)[:, held > 0]
    middle = np.median(chosen, axis=1)
    return np.asarray(np.where(np.isfinite(middle), middle, np.nan))


def _mode_in(base: Count, worst: int, rigid: int) -> int:
    low = base[left_in(base)[:, worst] > 0, 2 * worst]
    return max(int(np.median(low)) + 1 - rigid, 1)


def _rigid(search: Search) -> int:
    """Free directions of the model, which the counts contain and nobody calls a mode."""
    central = search.field.modes.frequency_hz[search.field.central]
    return int((central < RIGID_HZ).sum())


def _caught(
    search: Search, intervals: Sequence[tuple[float, float]], rigid: int
) -> tuple[tuple[int, ...], ...]:
    hertz = search.field.modes.frequency_hz[search.field.central][rigid:]
    return tuple(
        tuple(int(n) + 1 for n in np.flatnonzero((hertz >= low) & (hertz <= high)))
        for low, high in intervals
    )


def _motions(
    search: Search, axes: Sequence[str], places: Sequence[float], rigid: int
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """(modes, n) where each mode stands still along the axes, (modes,) which move across them."""
    base = search.field
    vector = base.modes.vector[base.central][:, rigid:]

    def size(directions: Sequence[str]) -> Array:
        return np.stack(
            [np.linalg.norm(base.spot(directions, x).rows @ vector, axis=0) for x in places], axis=1
        )

    along, anywhere = size(tuple(axes)), size(EVERY_WAY)
    largest = np.maximum(along.max(axis=1), 1e-12)
    still = along < NODE_SHARE * largest[:, None]
    return still, largest < OTHER_WAY_SHARE * anywhere.max(axis=1)
