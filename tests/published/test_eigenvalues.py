"""Eigenvalues lambda = beta L of uniform spans against published tables.

Values with ten figures are roots of the characteristic equations found to 30 digits. They round to
those of W. T. Thomson, Theory of Vibration with Applications, appendix D and table 9.5-1, which
are held beside them, and to R. D. Blevins, Formulas for Natural Frequency and Mode Shape (1979),
tables 8-1 and 8-3 (from memory).
"""

import math

import numpy as np
import pytest

from fieldkit.span import eigenvalues

CLAMPED_FREE = (1.875104069, 4.694091133, 7.854757438, 10.99554073, 14.13716839)
PINNED = (3.141592654, 6.283185307, 9.424777961, 12.56637061, 15.70796327)
CLAMPED_PINNED = (3.926602312, 7.068582746, 10.21017612, 13.35176878, 16.49336143)
CLAMPED = (4.730040745, 7.853204624, 10.99560784, 14.13716549, 17.27875966)
CLAMPED_GUIDED = (2.365020372, 5.497803919, 8.639379829, 11.78097245, 14.92256510)
PINNED_GUIDED = (1.570796327, 4.712388980, 7.853981634, 10.99557429, 14.13716694)

SINGLE_SPANS = {
    "clamped-free": CLAMPED_FREE,
    "pinned-pinned": PINNED,
    "clamped-pinned": CLAMPED_PINNED,
    "clamped-clamped": CLAMPED,
    "free-free": CLAMPED,
    "free-pinned": CLAMPED_PINNED,
    "clamped-guided": CLAMPED_GUIDED,
    "free-guided": CLAMPED_GUIDED,
    "pinned-guided": PINNED_GUIDED,
    "guided-guided": PINNED,
}

THOMSON = {
    # Thomson, appendix D: lambda and lambda^2, as printed
    "clamped-clamped": ((4.7300, 22.3733), (7.8532, 61.6728), (10.9956, 120.9034)),
    "clamped-free": ((1.8751, 3.5160), (4.6941, 22.0345), (7.8548, 61.6972)),
}

EQUAL_SPANS = {
    # N: pinned-pinned, clamped-pinned, clamped-clamped; lambda of one span. Three-moment
    # equation, computed and confirmed by 16 finite elements a span; two spans pinned (3.142,
    # 3.927) and three clamped (3.557, 4.297, 4.730) as in Blevins 1979, chapter 8 (from memory).
    1: ((3.1415927,), (3.9266023,), (4.7300407,)),
    2: ((3.1415927, 3.9266023), (3.3932313, 4.4633244), (3.9266023, 4.7300407)),
    3: (
        (3.1415927, 3.5564085, 4.2975297),
        (3.2605350, 3.9266023, 4.6014179),
        (3.5564085, 4.2975297, 4.7300407),
    ),
    4: (
        (3.1415927, 3.3932313, 3.9266023, 4.4633244),
        (3.2100871, 3.6453934, 4.2080503, 4.6552376),
        (3.3932313, 3.9266023, 4.4633244, 4.7300407),
    ),
    5: (
        (3.1415927, 3.3090521, 3.7003601, 4.1529437, 4.5504337),
        (3.1859255, 3.4883441, 3.9266023, 4.3663320, 4.6813686),
        (3.3090521, 3.7003601, 4.1529437, 4.5504337, 4.7300407),
    ),
    6: (
        (3.1415927, 3.2605350, 3.5564085, 3.9266023, 4.2975297),
        (3.1725717, 3.3932313, 3.7375009, 4.1157519, 4.4633244),
        (3.2605350, 3.5564085, 3.9266023, 4.2975297, 4.6014179),
    ),
    7: (
        (3.1415927, 3.2302200, 3.4602255, 3.7642261, 4.0890046),
        (3.1644393, 3.3318097, 3.6068022, 3.9266023, 4.2468058),
        (3.2302200, 3.4602255, 3.7642261, 4.0890046, 4.3948852),
    ),
    8: (
        (3.1415927, 3.2100871, 3.3932313, 3.6453934, 3.9266023),
        (3.1591280, 3.2900765, 3.5134899, 3.7843602, 4.0688598),
        (3.2100871, 3.3932313, 3.6453934, 3.9266023, 4.2080503),
    ),
    9: (
        (3.1415927, 3.1960664, 3.3449205, 3.5564085, 3.8000661),
        (3.1554714, 3.2605350, 3.4449117, 3.6758089, 3.9266023),
        (3.1960664, 3.3449205, 3.5564085, 3.8000661, 4.0531481),
    ),
    10: (
        (3.1415927, 3.1859255, 3.3090521, 3.4883441, 3.7003601),
        (3.1528482, 3.2389099, 3.3932313, 3.5915477, 3.8126565),
        (3.1859255, 3.3090521, 3.4883441, 3.7003601, 3.9266023),
    ),
}
END_PAIRS = ("pinned-pinned", "clamped-pinned", "clamped-clamped")

CLAMPED_SPANS_SQUARED = (
    # lambda_1^2 of N = 2..10 clamped equal spans, computed likewise
    15.41821, 12.64804, 11.51402, 10.94983, 10.63109, 10.43432, 10.30466, 10.21484, 10.15012,
)  # fmt: skip


@pytest.mark.parametrize("ends", eigenvalues.END_CONDITIONS)
def test_single_span_gives_the_table(ends):
    """Ten end conditions, five modes each, to the printed figures."""
    assert eigenvalues.single_span(ends) == pytest.approx(SINGLE_SPANS[ends], rel=1e-8)


@pytest.mark.parametrize("ends", THOMSON)
def test_single_span_rounds_to_thomson(ends):
    """The four and six figures Thomson prints."""
    found = eigenvalues.single_span(ends, 3)
    for b, (printed, printed_square) in zip(found, THOMSON[ends], strict=True):
        assert round(b, 4) == printed
        assert round(b**2, 4) == printed_square


def test_every_end_condition_solves_its_equation():
    """Each root put back into the published form of its equation leaves nothing."""
    b = {ends: eigenvalues.single_span(ends, 4) for ends in eigenvalues.END_CONDITIONS}
    assert np.cos(b["clamped-free"]) * np.cosh(b["clamped-free"]) == pytest.approx(
        [-1] * 4, abs=1e-7
    )
    assert np.cos(b["free-free"]) * np.cosh(b["free-free"]) == pytest.approx([1] * 4, abs=1e-7)
    assert np.tan(b["free-pinned"]) == pytest.approx(np.tanh(b["free-pinned"]), rel=1e-9)
    assert np.tan(b["free-guided"]) == pytest.approx(-np.tanh(b["free-guided"]), rel=1e-9)
    assert np.cos(b["pinned-guided"]) == pytest.approx([0] * 4, abs=1e-9)


@pytest.mark.parametrize("spans", EQUAL_SPANS)
@pytest.mark.parametrize("pair", range(3))
def test_equal_spans_give_the_table(spans, pair):
    """One to ten equal spans, three pairs of outer ends, to the printed figures."""
    printed = EQUAL_SPANS[spans][pair]
    found = eigenvalues.equal_spans(spans, END_PAIRS[pair], len(printed))
    assert found == pytest.approx(printed, abs=6e-8)


def test_clamped_equal_spans_squared():
    """The first eigenvalue squared of two to ten clamped spans."""
    found = [eigenvalues.equal_spans(n, "clamped-clamped", 1)[0] ** 2 for n in range(2, 11)]
    assert found == pytest.approx(CLAMPED_SPANS_SQUARED, abs=6e-6)


def test_frequencies_come_in_groups():
    """One mode a span in each group: Shock and Vibration 2011, article 940461 (abstract)."""
    second = eigenvalues.equal_spans(4, "clamped-pinned", 8)[4:]
    assert np.all((second > 2 * math.pi) & (second < 7.8532047))


def test_static_deflection_short_cut():
    """Pinned span: 2 pi f = 1.1262 sqrt(g/delta) with its own sag, delta = 5 m g L^4/(384 EI)."""
    first = eigenvalues.single_span("pinned-pinned", 1)[0]
    assert first**2 * math.sqrt(5 / 384) == pytest.approx(1.1262, abs=5e-5)
