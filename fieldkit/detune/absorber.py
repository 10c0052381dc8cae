"""A tuned absorber, and plain damping: the mode stays where it is, what is left of it is told.

Tuning and damping for a harmonic force on the main mass: Den Hartog, Mechanical Vibrations;
f_a / f = 1 / (1 + mu), and the damping ratio sqrt(3 mu / (8 (1 + mu))) where the damper is referred
to the absorber's own frequency. The form with (1 + mu)^3 is c / (2 m omega) with the omega of the
main mass. Peak sqrt(1 + 2 / mu). Warburton 1982, Earthquake Engineering and Structural Dynamics 10,
381, has the same for other loads (all from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge
from fieldkit.detune.candidates import Search, round_mass
from fieldkit.detune.excitation import Band, clear_of_all
from fieldkit.detune.fixes import AddAbsorber
from fieldkit.detune.magnification import magnification

Array = NDArray[np.float64]

MASS_RATIOS = (0.05, 0.075, 0.1, 0.15, 0.2, 0.3)
ALLOWED_AMPLIFICATION = 5.0
"""What an absorbed mode may multiply; a bare one multiplies 25 to 100 times."""
ASSUMED_DAMPING = 0.01
"""Where none was measured (common practice, no source)."""
SPRING_SCATTER_LN, DAMPER_SCATTER_LN = 0.06, 0.25
"""After tuning on a bench: 3 % in frequency (common practice, no source)."""
SAME_MODE = 0.03
"""Modes this close, relative, act together at a place: a tilted pair of planes."""
LINES = 41
SEED = 23


@dataclass(frozen=True)
class AbsorberOffer:
    """An absorber against one mode, judged over the ensemble."""

    change: AddAbsorber
    mass_ratio: float
    modal_mass_kg: float
    """Of the mode, at the absorber's place."""
    chance: float
    """That the mode is amplified less than allowed at every excitation and the others are clear."""
    amplification_now: float
    """Median over the members, worst excitation."""
    amplification: float
    stroke_ratio: float
    """Of the absorber's mass on the pipe, over the motion of the pipe; median, worst excitation."""
    mode_hz: float


def tuning(mass_ratio: float) -> float:
    """Absorber over main frequency."""
    return 1 / (1 + mass_ratio)


def own_damping(mass_ratio: float) -> float:
    """Damping ratio of the absorber, referred to its own frequency."""
    return float(np.sqrt(3 * mass_ratio / (8 * (1 + mass_ratio))))


def response(
    line_hz: Array,
    mode_hz: Array,
    damping: Array | float,
    mass_kg: Array,
    absorber: tuple[Array | float, Array | float, Array | float],
) -> tuple[Array, Array]:
    """Amplification of a mode with an absorber (m, k, c) on it, and the absorber's stroke.

    Both over the deflection that the force would cause at rest; arrays broadcast.
    """
    m, k, c = absorber
    w, w0 = 2 * np.pi * line_hz, 2 * np.pi * mode_hz
    stiff = k + 1j * w * c
    carried = -(w**2) * m * stiff / (stiff - w**2 * m)
    main = mass_kg * (w0**2 - w**2 + 2j * damping * w0 * w)
    motion = mass_kg * w0**2 / (main + carried)
    stroke = motion * w**2 * m / (stiff - w**2 * m)
    return np.abs(motion), np.abs(stroke)


def absorber_offer(
    search: Search, spectrum: judge.Spectrum, damping: float | None
) -> AbsorberOffer | None:
    """The lightest absorber that reaches the wanted chance on the mode least clear, or the best;
    None where no mode is likely to lie in a band, or nothing can be hung on."""
    places = search.attachable()
    target = _target(spectrum, search)
    if target is None or not places:
        return None
    mode_hz, direction = spectrum.frequency_hz[:, target], spectrum.direction[target]
    at_m, mass_kg = _place(search, places, mode_hz, direction)
    lines = _lines(search.bands, mode_hz)
    others = np.delete(spectrum.frequency_hz, target, axis=1)
    up_to_hz = search.goal.up_to_hz
    clear = np.all(clear_of_all(others, search.bands) | (others > up_to_hz), axis=1)
    zeta = ASSUMED_DAMPING if damping is None else damping
    now = magnification(lines[None, :] / mode_hz[:, None], zeta).max(axis=1)
    best: AbsorberOffer | None = None
    for ratio in MASS_RATIOS:
        change = _tuned(
            at_m, direction, ratio, float(np.median(mass_kg)), float(np.median(mode_hz))
        )
        motion, stroke = _installed(change, lines, mode_hz, zeta, mass_kg)
        worst = motion.max(axis=1)
        chance = judge.chance_of(clear & (worst <= ALLOWED_AMPLIFICATION))
        offer = AbsorberOffer(
            change,
            ratio,
            float(np.median(mass_kg)),
            chance,
            float(np.median(now)),
            float(np.median(worst)),
            float(np.median(stroke.max(axis=1) / worst)),
            float(np.median(mode_hz)),
        )
        if best is None or offer.chance > best.chance + 0.02:
            best = offer
        if chance >= search.goal.chance:
            return offer
    return best


def _target(spectrum: judge.Spectrum, search: Search) -> int | None:
    """The followed mode that most members have in a band."""
    frequency = spectrum.frequency_hz
    within = frequency <= search.goal.up_to_hz
    caught = (~clear_of_all(frequency, search.bands) & within).mean(axis=0)
    return int(np.argmax(caught)) if caught.max(initial=0.0) > 0.1 else None


def _place(
    search: Search, places: Sequence[float], mode_hz: Array, direction: str
) -> tuple[float, Array]:
    """Where the mode moves most, and its modal mass (members,) there."""
    base = search.field
    own = base.modes.frequency_hz
    closest = np.argmin(np.abs(own - mode_hz[:, None]), axis=1)
    near = np.abs(own / np.take_along_axis(own, closest[:, None], axis=1) - 1) < SAME_MODE
    shape = np.stack(
        [np.sum((base.spot((direction,), x).rows @ base.modes.vector) ** 2, axis=1) for x in places]
    )
    mobile = np.sum(np.where(near, shape, 0.0), axis=2)
    best = int(np.argmax(np.median(mobile, axis=1)))
    floor = 1e-3 * max(float(np.median(mobile[best])), 1e-12)
    return places[best], 1 / np.maximum(mobile[best], floor)


def _lines(bands: Sequence[Band], mode_hz: Array) -> Array:
    """Frequencies of the excitations in whose bands the mode may lie."""
    near = [
        band
        for band in bands
        if np.any((mode_hz >= band.avoid_low_hz) & (mode_hz <= band.avoid_high_hz))
    ]
    return np.concatenate([np.linspace(band.low_hz, band.high_hz, LINES) for band in near])


def _tuned(
    at_m: float, direction: str, ratio: float, modal_mass_kg: float, mode_hz: float
) -> AddAbsorber:
    mass_kg = round_mass(ratio * modal_mass_kg)
    exact = mass_kg / modal_mass_kg
    omega = 2 * np.pi * mode_hz * tuning(exact)
    stiffness, damping = mass_kg * omega**2, 2 * own_damping(exact) * mass_kg * omega
    return AddAbsorber(at_m, mass_kg, float(f"{stiffness:.4g}"), float(f"{damping:.3g}"), direction)


def _installed(
    change: AddAbsorber, lines: Array, mode_hz: Array, zeta: float, mass_kg: Array
) -> tuple[Array, Array]:
    """(members, lines) amplification and stroke, spring and damper as they come out."""
    spring, damper = np.random.default_rng(SEED).standard_normal((2, len(mode_hz), 1))
    made = (
        change.mass_kg,
        change.stiffness_n_per_m * np.exp(SPRING_SCATTER_LN * spring),
        change.damping_n_s_per_m * np.exp(DAMPER_SCATTER_LN * damper),
    )
    return response(lines[None, :], mode_hz[:, None], zeta, mass_kg[:, None], made)
