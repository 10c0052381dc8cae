"""The element matrices alone: one-element values and the law of convergence.

lambda^2 of consistent-mass slender elements. 3.5327 and 34.807 of the one-element cantilever stand
in finite-element textbooks (from memory); the table was computed apart from the package.
"""

import math

import numpy as np
import pytest

from fieldkit.span.eigenvalues import single_span
from tests.reference.element_chain import lambda_squared

BY_ELEMENTS = {
    # ends: {elements: lambda^2 of modes 1, 2, 3}
    "clamped-free": {
        1: (3.53273, 34.80689),
        2: (3.51772, 22.22147, 75.15708),
        3: (3.51637, 22.10686, 62.46598),
        4: (3.51613, 22.06017, 62.17489),
        6: (3.51604, 22.03993, 61.8101),
        8: (3.51602, 22.03625, 61.73474),
        10: (3.51602, 22.03522, 61.71292),
        16: (3.51602, 22.0346, 61.69967),
    },
    "pinned-pinned": {
        1: (10.95445, 50.1996),
        2: (9.90856, 43.8178, 110.1397),
        3: (9.87760, 39.94506, 98.5901),
        4: (9.87217, 39.63423, 90.4495),
        6: (9.87012, 39.51038, 89.1770),
        8: (9.86977, 39.48867, 88.9407),
        10: (9.86967, 39.48264, 88.8739),
        16: (9.86961, 39.47907, 88.8338),
    },
    "clamped-pinned": {
        1: (20.4939,),
        2: (15.56082, 58.40604, 155.639),
        3: (15.44848, 50.83812, 118.466),
        4: (15.42795, 50.27655, 106.597),
        6: (15.42015, 50.02948, 104.810),
        8: (15.41882, 49.98561, 104.432),
        10: (15.41846, 49.97342, 104.324),
        16: (15.41824, 49.96618, 104.260),
    },
    "clamped-clamped": {
        2: (22.73594, 81.97561),
        3: (22.46482, 62.90413, 146.305),
        4: (22.40298, 62.24328, 123.486),
        6: (22.37923, 61.7939, 121.770),
        8: (22.37517, 61.71179, 121.190),
        10: (22.37406, 61.6889, 121.023),
        16: (22.3734, 61.6753, 120.922),
    },
}
EXACT = {
    "clamped-free": (3.51602, 22.03449, 61.69721),
    "pinned-pinned": (9.86960, 39.47842, 88.8264),
    "clamped-pinned": (15.41821, 49.96486, 104.248),
    "clamped-clamped": (22.37329, 61.67282, 120.903),
}
CASES = [(ends, count) for ends, rows in BY_ELEMENTS.items() for count in rows]


def test_one_element_cantilever():
    """12 EI/L^3 and 156 m L/420: 3.53273 and 34.80689."""
    assert lambda_squared(1, "clamped-free", 2) == pytest.approx((3.53273, 34.80689), rel=1e-5)


@pytest.mark.parametrize(("ends", "count"), CASES)
def test_table(ends, count):
    """Every entry to its five to seven printed figures."""
    printed = BY_ELEMENTS[ends][count]
    found = lambda_squared(count, ends, len(printed))
    assert found == pytest.approx(printed, rel=1e-5)


@pytest.mark.parametrize("ends", EXACT)
def test_convergence_is_from_above_and_as_the_fourth_power(ends):
    """Halving the elements divides the error of mode 1 by 16; all errors are positive."""
    exact = single_span(ends, 3) ** 2
    assert exact == pytest.approx(EXACT[ends], rel=5e-6)
    errors = np.array([lambda_squared(n, ends, 3) / exact - 1 for n in (4, 8, 16)])
    assert np.all(errors > 0)
    assert errors[0, 0] / errors[1, 0] == pytest.approx(16, rel=0.05)
    assert errors[1, 0] / errors[2, 0] == pytest.approx(16, rel=0.05)


def test_pinned_errors_as_printed():
    """10.99, 0.395, 0.026 and 0.0016 % with 1, 2, 4 and 8 elements."""
    errors = [
        100 * (lambda_squared(n, "pinned-pinned", 1)[0] / math.pi**2 - 1) for n in (1, 2, 4, 8)
    ]
    assert errors == pytest.approx([10.99, 0.395, 0.026, 0.0016], rel=0.03)


def test_ten_elements_give_three_modes_to_a_thousandth():
    """The rule of thumb of ten elements a span."""
    for ends, exact in EXACT.items():
        assert lambda_squared(10, ends, 3) == pytest.approx(exact, rel=1e-3)
