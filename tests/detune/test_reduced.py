"""The small model against the full one."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import member_span, member_state, unknowns_of
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, riser, straight

SPANS = {"straight": straight, "riser": riser}


@pytest.mark.parametrize("name", SPANS)
def test_random_members_agree_with_a_model_built_anew(name):
    """Within 0.5 %, less than the model error of the match; lengths enter only to first order."""
    span = SPANS[name]()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    model = build(span, TAPPED, unknowns, UP_TO_HZ)
    z = np.random.default_rng(2).standard_normal((6, len(unknowns)))
    small = model.modes(z).frequency_hz
    for row, member in zip(small, z, strict=True):
        full = [
            mode.frequency_hz
            for mode in span_modes(
                member_span(span, unknowns, member),
                member_state(TAPPED, unknowns, member),
                UP_TO_HZ,
            )
        ]
        vibrating = row[row > 0.2][: len(full)]
        assert vibrating == pytest.approx(full, rel=5e-3)


@pytest.mark.parametrize("name", SPANS)
def test_slopes_are_the_derivatives_of_the_frequencies(name):
    span = SPANS[name]()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    model = build(span, TAPPED, unknowns, UP_TO_HZ)
    z = np.random.default_rng(3).standard_normal((1, len(unknowns)))
    slopes = model.frequency_slopes(z, model.modes(z), 8)[0]
    step = 1e-5
    for i in range(len(unknowns)):
        up, down = z.copy(), z.copy()
        up[0, i] += step
        down[0, i] -= step
        difference = model.modes(up).frequency_hz[0, :8] - model.modes(down).frequency_hz[0, :8]
        assert slopes[i] == pytest.approx(difference / (2 * step), abs=1e-4)


def test_planes_of_a_straight_pipe_are_solved_apart():
    unknowns = unknowns_of(straight(), (TAPPED, RUNNING))
    model = build(straight(), TAPPED, unknowns, UP_TO_HZ)
    assert len(model.blocks) == 2
