"""Frequencies after a fix over the whole ensemble, checked against a full re-solve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band, clear_of_all
from fieldkit.detune.field import AXES, Field
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.lowrank import condensed, kept_modes
from fieldkit.detune.push import Push
from fieldkit.detune.tracking import follow, followed
from fieldkit.detune.unknowns import StationMap, member_span, member_state, station_map
from fieldkit.detune.verdict import JudgedMode, Nearest
from fieldkit.span.layout import Span, State
from fieldkit.span.modes import span_modes

Array = NDArray[np.float64]

SEED = 22
RIGID_HZ = 0.2
"""Below this a mode is a free direction of the model, not a vibration."""
WORST_DISAGREEMENT = 0.01
"""Beyond this the user is told; on a hot line a change of axial restraint alone can cause it, since
the quick model keeps the axial force of the span as it is."""


@dataclass(frozen=True)
class Spectrum:
    """Frequencies of every member, mode by mode."""

    frequency_hz: Array
    """(members, modes) followed modes, in rising order at the central member."""
    direction: tuple[str, ...]
    all_hz: Array
    """(members, r) unfollowed, rising: what clearness is judged by."""


def now(field: Field, up_to_hz: float) -> Spectrum:
    """The ensemble as it is."""
    return _spectrum(field, field.modes.frequency_hz, field.modes.vector, up_to_hz)


def after(field: Field, push: Push, up_to_hz: float) -> Spectrum:
    """The ensemble with a change applied."""
    base = field
    if push.without_springs or push.without_masses:
        base = field.without(push.without_springs, push.without_masses)
    if not push.rows.shape[1]:
        return _spectrum(field, base.modes.frequency_hz, base.modes.vector, up_to_hz)
    seen = condensed(base.modes, push.rows, push.residual, kept_modes(base.modes, up_to_hz))
    modes = seen.modes(push.stiffness, push.mass)
    return _spectrum(field, modes.frequency_hz, modes.vector, up_to_hz)


def _spectrum(field: Field, frequency_hz: Array, vector: Array, up_to_hz: float) -> Spectrum:
    central = field.central
    wanted = np.flatnonzero(frequency_hz[central] > RIGID_HZ)
    count = max(1, int(np.sum(frequency_hz[central, wanted] < 1.3 * up_to_hz)))
    wanted = wanted[: count + 1]
    share = field.direction_share(vector)
    chosen = follow(frequency_hz, share, frequency_hz[central, wanted], share[central, wanted])
    directions = tuple(AXES[i] for i in np.argmax(share[central, wanted], axis=1))
    alive = np.where(frequency_hz > RIGID_HZ, frequency_hz, np.nan)
    return Spectrum(followed(frequency_hz, chosen), directions, alive)


def corrected(
    spectrum: Spectrum, field: Field, exact_hz: Sequence[float], up_to_hz: float
) -> tuple[Spectrum, float]:
    """Scale each mode by exact over reduced frequency at the central member; doubt the others.

    Returns the scaled spectrum and the largest relative correction of a mode up to the limit.
    """
    central = spectrum.all_hz[field.central]
    central = central[~np.isnan(central)]
    count = min(len(central), len(exact_hz))
    ratio = np.asarray(exact_hz[:count]) / central[:count]
    looked_at = np.asarray(exact_hz[:count]) <= up_to_hz
    worst = float(np.max(np.abs(ratio - 1), initial=0.0, where=looked_at))
    if not count:
        return spectrum, worst
    tracked = np.interp(spectrum.frequency_hz, central[:count], ratio)
    every = np.interp(spectrum.all_hz, central[:count], ratio)
    scaled = replace(
        spectrum,
        frequency_hz=spectrum.frequency_hz * tracked,
        all_hz=spectrum.all_hz * every,
    )
    return _doubted(scaled, field.central), worst


def _doubted(spectrum: Spectrum, central: int) -> Spectrum:
    """With what no parameter accounts for, drawn for every mode of every other member."""
    rng = np.random.default_rng(SEED)
    factor = 1 + MODEL_ERROR * rng.standard_normal(spectrum.all_hz.shape)
    factor[central] = 1.0
    every = np.nan_to_num(spectrum.all_hz, nan=-1.0)
    same = np.argmin(np.abs(every[:, None, :] - spectrum.frequency_hz[:, :, None]), axis=2)
    return replace(
        spectrum,
        frequency_hz=spectrum.frequency_hz * np.take_along_axis(factor, same, axis=1),
        all_hz=spectrum.all_hz * factor,
    )


def resolve(
    field: Field, span: Span, state: State, change: Change | None, up_to_hz: float
) -> list[float]:
    """Frequencies of the central member from a model built anew with the change in it."""
    unknowns, z = field.model.unknowns, field.z[field.central]
    member = member_span(span, unknowns, z)
    if change is not None:
        member = _on_member(change, span, member, station_map(span, unknowns, z)).apply(member)
    modes = span_modes(member, member_state(state, unknowns, z), up_to_hz)
    return [mode.frequency_hz for mode in modes if mode.frequency_hz > RIGID_HZ]


def _on_member(change: Change, span: Span, member: Span, moved: StationMap) -> Change:
    """The change as it meets one member: stations stretched, existing values the member's own."""
    if isinstance(change, AllOf):
        return AllOf(tuple(_on_member(part, span, member, moved) for part in change.parts))
    if isinstance(change, MoveSupport | MoveMass):
        return replace(change, to_m=moved(change.to_m))
    if isinstance(change, SetMass):
        nominal, actual = span.masses[change.index].mass_kg, member.masses[change.index].mass_kg
        return replace(change, mass_kg=change.mass_kg * actual / nominal)
    if isinstance(change, StiffenSupport):
        return _at_least(change, member)
    if isinstance(change, AddSupport | AddMass):
        return replace(change, at_m=moved(change.at_m))
    return change


def _at_least(change: StiffenSupport, member: Span) -> StiffenSupport:
    """A support that is stiffer already stays as it is."""
    old = member.supports[change.index]

    def total(new: float | None, now: object) -> float | None:
        if new is None or not isinstance(now, float):
            return new
        return max(new, now)

    return replace(
        change,
        vertical_n_per_m=total(change.vertical_n_per_m, old.vertical),
        lateral_n_per_m=total(change.lateral_n_per_m, old.lateral),
        rotation_n_m_per_rad=total(change.rotation_n_m_per_rad, old.rotation),
    )


def members_clear(spectrum: Spectrum, bands: Sequence[Band], up_to_hz: float) -> NDArray[np.bool_]:
    """(members,) whether every mode up to the limit lies outside every band."""
    frequency = spectrum.all_hz
    ignored = np.isnan(frequency) | (frequency > up_to_hz)
    clear = clear_of_all(np.where(ignored, -1.0, frequency), bands)
    return np.asarray(np.all(clear | ignored, axis=1))


def chance_of(clear: NDArray[np.bool_]) -> float:
    """(k + 1/2) / (n + 1) for k clear members of n, the Jeffreys estimate: a finite ensemble can
    promise neither 0 nor 1."""
    return float((clear.sum() + 0.5) / (len(clear) + 1))


def chance_clear(
    spectrum: Spectrum,
    bands: Sequence[Band],
    up_to_hz: float,
    members: NDArray[np.intp] | None = None,
) -> float:
    """Chance that every mode up to the limit lies outside every band, over some or all members."""
    clear = members_clear(spectrum, bands, up_to_hz)
    return chance_of(clear if members is None else clear[members])


def judged_modes(
    spectrum: Spectrum, bands: Sequence[Band], up_to_hz: float
) -> tuple[JudgedMode, ...]:
    """Modes up to the limit (at least one) with their intervals."""
    low, median, high = np.quantile(spectrum.frequency_hz, (0.05, 0.5, 0.95), axis=0)
    order = np.argsort(median)
    shown = [j for j in order if low[j] <= up_to_hz] or [int(order[0])]
    modes = []
    for j in shown:
        frequency = spectrum.frequency_hz[:, j]
        clear = clear_of_all(frequency, bands) | (frequency > up_to_hz)
        modes.append(
            JudgedMode(
                float(median[j]),
                float(low[j]),
                float(high[j]),
                spectrum.direction[j],
                float(clear.mean()),
            )
        )
    return tuple(modes)


def nearest(modes: Sequence[JudgedMode], bands: Sequence[Band]) -> Nearest | None:
    """The band closest to any mode, by the medians."""
    distances = [(band.separation(mode.median_hz), band.name) for mode in modes for band in bands]
    if not distances:
        return None
    separation, name = min(distances)
    return Nearest(name, separation)
