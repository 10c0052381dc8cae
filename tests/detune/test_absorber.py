"""Tuned absorbers: published tuning and peaks, and the chance over the ensemble."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune import judge
from fieldkit.detune.absorber import (
    ALLOWED_AMPLIFICATION,
    AbsorberOffer,
    absorber_offer,
    own_damping,
    response,
    tuning,
)
from fieldkit.detune.candidates import Search
from fieldkit.detune.excitation import bands
from fieldkit.detune.other_cures import other_cures
from tests.detune.lines import UP_TO_HZ, shaken
from tests.detune.test_chance_map import searching

LINES = np.linspace(5.0, 20.0, 6001)
PUBLISHED = ((0.01, 0.99010, 0.06093), (0.05, 0.95238, 0.13363), (0.1, 0.90909, 0.18464),
             (0.2, 0.83333, 0.25))  # fmt: skip
"""Mass ratio, frequency ratio, damping ratio on the absorber's own frequency: Den Hartog,
Mechanical Vibrations, optimum for a harmonic force on the main mass (from memory, recomputed)."""


def peak(ratio: float, zeta: float) -> float:
    """Largest amplification of an undamped main mass of 1 kg at 10 Hz."""
    omega = 2 * np.pi * 10.0 * tuning(ratio)
    absorber = (ratio, ratio * omega**2, 2 * zeta * ratio * omega)
    return float(response(LINES, np.array(10.0), 0.0, np.array(1.0), absorber)[0].max())


@pytest.mark.parametrize(("ratio", "frequency", "damping"), PUBLISHED)
def test_tuning_and_damping_are_the_published_ones(ratio, frequency, damping):
    assert tuning(ratio) == pytest.approx(frequency, abs=1e-5)
    assert own_damping(ratio) == pytest.approx(damping, abs=1e-5)


@pytest.mark.parametrize("ratio", [0.02, 0.05, 0.1, 0.2])
def test_the_peak_is_the_published_one(ratio):
    """sqrt(1 + 2 / mu), which the optimum damping exceeds by up to 0.4 %."""
    assert peak(ratio, own_damping(ratio)) == pytest.approx(np.sqrt(1 + 2 / ratio), rel=4e-3)


def test_the_damping_of_the_main_frequency_is_not_taken_for_the_absorbers_own():
    """With mu = 0.1 the mistaken ratio 0.1679 would give 4.68 instead of 4.59."""
    mistaken = np.sqrt(3 * 0.1 / (8 * 1.1**3))
    assert peak(0.1, mistaken) == pytest.approx(4.68, abs=0.01)
    assert peak(0.1, own_damping(0.1)) == pytest.approx(4.59, abs=0.01)


def test_the_stroke_is_the_relative_motion_of_the_two_masses():
    """From the two equations of motion solved as a 2 x 2 system."""
    m, ma, k, ka, c = 3.0, 0.3, 3.0 * 60**2, 0.3 * 55**2, 4.0
    w = 2 * np.pi * 9.0
    matrix = np.array([[k + ka - w**2 * m + 1j * w * c, -ka - 1j * w * c],
                       [-ka - 1j * w * c, ka - w**2 * ma + 1j * w * c]])  # fmt: skip
    main, small = np.linalg.solve(matrix, np.array([k, 0.0]))
    motion, stroke = response(
        np.array(9.0), np.array(60 / (2 * np.pi)), 0.0, np.array(m), (ma, ka, c)
    )
    assert motion == pytest.approx(abs(main))
    assert stroke == pytest.approx(abs(small - main))


def one_plane() -> Search:
    """The well-known beam, shaken at its first mode."""
    return searching("beam")


def test_an_absorber_stands_where_the_mode_moves_most_and_takes_most_of_it():
    """Its modal mass is that of the published mode shape."""
    search = one_plane()
    spectrum = judge.now(search.field, UP_TO_HZ)
    offer = absorber_offer(search, spectrum, 0.01)
    assert offer is not None
    assert offer.amplification < offer.amplification_now
    assert offer.amplification_now > 20
    assert 0.04 < offer.mass_ratio < 0.31
    assert offer.modal_mass_kg == pytest.approx(_modal_mass(search, offer.change.at_m), rel=0.1)


def _modal_mass(search: Search, at_m: float) -> float:
    """A built-in span's first mode: about 0.4 m L at its middle (Blevins, Formulas for Natural
    Frequency and Mode Shape, clamped-clamped: 1 / 1.588^2 = 0.397; from memory)."""
    pipe, material = search.span.pipe, search.span.material
    assert at_m == pytest.approx(3.0, abs=0.2)
    return 0.397 * 6.0 * pipe.wall_area_m2 * material.density_kg_per_m3


def first_alone(sd: float) -> judge.Spectrum:
    """The first mode of the beam as if it were the only one, this much in doubt."""
    whole = judge.now(one_plane().field, UP_TO_HZ)
    middle = float(np.median(whole.frequency_hz[:, 0]))
    noise = np.random.default_rng(1).standard_normal((len(whole.all_hz), 1))
    hertz = middle * np.exp(sd * noise)
    return judge.Spectrum(hertz, whole.direction[:1], hertz)


@pytest.mark.parametrize("sd", [0.005, 0.05])
def test_the_chance_is_that_of_the_two_masses_solved_with_other_scatter(sd):
    """3 % on the spring's frequency, 25 % on the damper, the mode's doubt: within 6 %."""
    spectrum = first_alone(sd)
    offer = absorber_offer(one_plane(), spectrum, 0.01)
    assert offer is not None
    rng = np.random.default_rng(8)
    kept = [_worst(offer, hertz, *rng.standard_normal(2)) <= ALLOWED_AMPLIFICATION
            for hertz in spectrum.frequency_hz[:, 0]]  # fmt: skip
    assert offer.chance == pytest.approx(np.mean(kept), abs=0.06)


def _worst(offer: AbsorberOffer, hertz: float, spring: float, damper: float) -> float:
    """Largest amplification over the excitation's range, from two equations of motion."""
    change, band = offer.change, one_plane().bands[0]
    m, ma = offer.modal_mass_kg, change.mass_kg
    k, c0 = m * (2 * np.pi * hertz) ** 2, 2 * 0.01 * m * 2 * np.pi * hertz
    ka = change.stiffness_n_per_m * np.exp(0.06 * spring)
    c = change.damping_n_s_per_m * np.exp(0.25 * damper)
    w = 2 * np.pi * np.linspace(band.low_hz, band.high_hz, 41)
    link = ka + 1j * w * c
    matrix = np.empty((41, 2, 2), complex)
    matrix[:, 0, 0] = k - w**2 * m + 1j * w * c0 + link
    matrix[:, 0, 1] = matrix[:, 1, 0] = -link
    matrix[:, 1, 1] = link - w**2 * ma
    force = np.zeros((41, 2, 1))
    force[:, 0] = k
    return float(np.abs(np.linalg.solve(matrix, force)[:, 0]).max())


def test_it_is_not_offered_where_another_mode_stays_in_the_band():
    """The beam's two planes resonate together: one absorber cannot answer for both."""
    search = one_plane()
    kinds = [c.kind for c in other_cures(search, judge.now(search.field, UP_TO_HZ), None, "SI")]
    assert kinds == ["damping"]


def test_no_absorber_where_no_mode_is_in_a_band():
    search = replace(one_plane(), bands=bands(shaken(1.0), 0.1))
    assert absorber_offer(search, judge.now(search.field, UP_TO_HZ), None) is None
    assert other_cures(search, judge.now(search.field, UP_TO_HZ), None, "SI") == ()


def test_other_cures_say_what_their_chance_means_and_never_clear():
    absorber, damping = other_cures(one_plane(), first_alone(0.005), None, "SI")
    assert absorber.change is not None
    assert set(absorber.change.as_json()["add_absorber"]) == {
        "at_m", "mass_kg", "stiffness_n_per_m", "damping_n_s_per_m"
    }  # fmt: skip
    assert f"less than {ALLOWED_AMPLIFICATION:g} times" in absorber.chance_means
    assert "not clear" in absorber.cautions[0]
    assert damping.chance is None
    assert damping.amplification_now == pytest.approx(1 / (2 * 0.01))
    assert damping.amplification_after == pytest.approx(1 / (2 * 0.05))
    assert "damping assumed" in damping.summary
