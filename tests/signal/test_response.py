"""H1, H2 and coherence against closed forms; conversion between accelerance and its integrals."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.response import (
    RELATIVE,
    FrequencyResponse,
    Struck,
    as_quantity,
    coherence_near,
    frequency_response,
)
from tests.signal.made_blows import HalfSine, Vibrating, accelerance, two_channels

RATE_HZ = 2048.0
MODES = (Vibrating(22.0, 0.012, 1 / 40), Vibrating(57.0, 0.02, -1 / 25))


def blows(count: int, **noise: float) -> list[Struck]:
    """Hits at the start of records of six seconds, each of another strength."""
    out = []
    for i in range(count):
        hit = HalfSine(0.01 + 1e-4 * i, 60.0 + 20.0 * i)
        force, response = two_channels(MODES, [hit], 6.0, RATE_HZ, seed=i, **noise)
        out.append(Struck(np.where(np.arange(len(force)) < 40, force, 0.0), response, 5.99))
    return out


def measured(struck: list[Struck], **more: object) -> FrequencyResponse:
    given = {"quantity": "acceleration", "scale": 1.0, "force_scale": 1.0} | more
    return frequency_response(struck, RATE_HZ, high_hz=300.0, **given)  # type: ignore[arg-type]


def test_the_response_is_the_accelerance_of_the_modes() -> None:
    """Closed form at every line; at resonance |A| = w_n^2 / (2 k zeta) = R / (2 zeta)."""
    found = measured(blows(3))
    exact = accelerance(MODES, found.frequency_hz)
    near = (found.frequency_hz > 15) & (found.frequency_hz < 200)
    assert np.abs(found.h1 / exact - 1)[near].max() < 0.01
    assert found.h2[near] == pytest.approx(found.h1[near], rel=1e-4)
    alone = accelerance(MODES[:1], np.array([22.0]))[0]
    assert abs(alone) == pytest.approx((1 / 40) / (2 * 0.012))
    assert abs(found.h1[np.argmin(np.abs(found.frequency_hz - 22.0))]) == pytest.approx(
        abs(accelerance(MODES, np.array([22.0]))[0]), rel=0.01
    )
    assert found.coherence is not None
    assert found.coherence[near].min() > 0.999


def noisy_gain(input_share: float, output_share: float) -> FrequencyResponse:
    """A gain of 3 driven by white noise 600 times, with noise of these powers on both channels."""
    rng = np.random.default_rng(4)
    struck = []
    for _ in range(600):
        force = rng.standard_normal(128)
        seen = force + np.sqrt(input_share) * rng.standard_normal(128)
        response = 3 * force + 3 * np.sqrt(output_share) * rng.standard_normal(128)
        struck.append(Struck(seen, response, 1.0))
    return measured(struck)


@pytest.mark.parametrize(("a", "b"), [(0.0, 0.0), (0.25, 0.0), (0.0, 0.5), (0.25, 0.5)])
def test_each_estimate_is_biased_as_theory_says(a: float, b: float) -> None:
    """With noise over signal a in the force and b in the response H1 = H / (1 + a), H2 = H (1 + b)
    and the coherence is 1 / ((1 + a)(1 + b)) (Bendat and Piersol, Random Data, chapter 6)."""
    found = noisy_gain(a, b)
    assert np.mean(found.h1.real) == pytest.approx(3 / (1 + a), rel=0.02)
    assert abs(np.mean(found.h1.imag)) < 0.05
    assert np.mean(np.abs(found.h2)) == pytest.approx(3 * (1 + b), rel=0.02)
    assert found.coherence is not None
    assert np.mean(found.coherence) == pytest.approx(1 / ((1 + a) * (1 + b)), abs=0.01)


def test_coherence_of_nothing_common_is_one_over_the_blows() -> None:
    """Expected value of the estimate for n averages of unrelated noise."""
    rng = np.random.default_rng(8)
    struck = [Struck(rng.standard_normal(4096), rng.standard_normal(4096), 1.0) for _ in range(4)]
    found = measured(struck)
    assert found.coherence is not None
    assert np.mean(found.coherence) == pytest.approx(0.25, abs=0.02)


def test_one_blow_has_no_coherence() -> None:
    """It would be 1 by identity, and H2 is H1."""
    found = measured(blows(1, noise_m_per_s2=0.05))
    assert found.coherence is None
    assert found.h2 == pytest.approx(found.h1)
    assert coherence_near(found, 22.0, 1.0) is None


def test_calibration_scales_the_response() -> None:
    """0.5 m/s^2 and 400 N per unit of sample."""
    plain, scaled = measured(blows(2)), measured(blows(2), scale=0.5, force_scale=400.0)
    assert scaled.h1 == pytest.approx(plain.h1 / 800)
    assert (scaled.quantity, scaled.unit) == ("accelerance", "(m/s^2)/N")


@pytest.mark.parametrize(
    ("given", "quantity"),
    [
        ({"force_scale": None}, "accelerance"),
        ({"scale": None}, "accelerance"),
        ({"quantity": None}, "response"),
        ({"quantity": "velocity", "scale": None}, "mobility"),
    ],
)
def test_what_is_not_calibrated_is_relative(given: dict[str, object], quantity: str) -> None:
    """And says so in its unit, also after a conversion."""
    found = measured(blows(2), **given)
    assert (found.quantity, found.unit, found.calibrated) == (quantity, RELATIVE, False)
    if quantity != "response":
        assert as_quantity(found, "receptance").unit == RELATIVE


def test_accelerance_mobility_and_receptance_are_one() -> None:
    """A = i w Y = -w^2 a."""
    found = measured(blows(2))
    omega = 2 * np.pi * found.frequency_hz
    mobility, receptance = as_quantity(found, "mobility"), as_quantity(found, "receptance")
    assert mobility.h1 == pytest.approx(found.h1 / (1j * omega))
    assert receptance.h2 == pytest.approx(-found.h2 / omega**2)
    assert (mobility.unit, receptance.unit) == ("(m/s)/N", "m/N")
    assert as_quantity(receptance, "accelerance").h1 == pytest.approx(found.h1)


def test_sound_pressure_cannot_be_turned_into_motion() -> None:
    found = measured(blows(2), quantity="pressure")
    assert (found.quantity, found.unit) == ("pressure per force", "Pa/N")
    with pytest.raises(InputError, match="pressure per force cannot be turned into mobility"):
        as_quantity(found, "mobility")


def test_no_blow_and_no_force_are_refused() -> None:
    with pytest.raises(Refusal, match="no blow has a force"):
        measured([])
    with pytest.raises(Refusal, match="without any force or response"):
        measured([Struck(np.zeros(512), np.ones(512), 1.0)])


def test_coherence_near_a_mode_is_that_of_its_band() -> None:
    found = measured(blows(3, noise_m_per_s2=0.5))
    assert found.coherence is not None
    near = np.abs(found.frequency_hz - 22.0) <= 0.264
    assert coherence_near(found, 22.0, 0.528) == pytest.approx(found.coherence[near].mean())
    line = int(np.argmin(np.abs(found.frequency_hz - 22.05)))
    assert coherence_near(found, 22.05, 0.0) == pytest.approx(found.coherence[line])
