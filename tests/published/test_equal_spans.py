"""Two to ten equal spans over rigid supports by the span model, lambda of one span.

The values are those of ``test_eigenvalues``: three-moment equation; Blevins 1979, chapter 8 (from
memory) agrees where it was recalled. The pipe has L/D = 600 a span, so that shear and rotary
inertia take no more than 2e-5 of lambda.
"""

import numpy as np
import pytest

from tests.published.test_eigenvalues import END_PAIRS, EQUAL_SPANS
from tests.reference.spans import hold, level_span, unit_hz, vertical_hz

SPAN_M = 12.0
MESHED_FOR = 120.0
"""lambda^2 the mesh is laid for, well above those asked for: eight elements a span and more."""


@pytest.mark.parametrize("spans", [n for n in EQUAL_SPANS if n > 1])
@pytest.mark.parametrize("pair", range(3))
def test_equal_spans(spans, pair):
    """The first five modes (fewer on fewer spans) within 1e-4 of lambda."""
    left, right = END_PAIRS[pair].split("-")
    inner = [hold(SPAN_M * i) for i in range(1, spans)]
    length = SPAN_M * spans
    span = level_span(length, [hold(0.0, left), *inner, hold(length, right)])
    unit = unit_hz(span, SPAN_M)
    printed = EQUAL_SPANS[spans][pair]
    found = vertical_hz(span, len(printed), MESHED_FOR * unit)
    assert np.sqrt(found / unit) == pytest.approx(printed, rel=1e-4)
