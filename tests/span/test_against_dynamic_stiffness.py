"""The span model against exact dynamic stiffness on random straight lines, five modes each.

Shear and rotary inertia are in both; the model's mesh is the one it lays for itself. Two hundred
more: ``python -m tests.bench.exact_spans``.
"""

import random

import numpy as np
import pytest

from tests.reference.random_lines import MODES, random_line, relative_errors


@pytest.mark.parametrize("seed", range(60))
def test_random_line(seed):
    """The first five vertical modes within 0.1 %."""
    errors = relative_errors(*random_line(random.Random(seed)))
    assert errors == pytest.approx(np.zeros(MODES), abs=1e-3)
