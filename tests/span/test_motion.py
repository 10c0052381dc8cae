"""Nodes, antinodes and the place to tap are those of shapes known in closed form."""

import numpy as np
import pytest

from fieldkit.span.modes import Mode
from fieldkit.span.motion import antinodes, nodes, tap_place

LENGTH_M = 6.0
STATIONS = np.linspace(0.0, LENGTH_M, 121)


def half_waves(number, axis=2):
    """sin(n pi x / L), the shape of a simply supported beam."""
    shape = np.zeros((len(STATIONS), 3))
    shape[:, axis] = np.sin(number * np.pi * STATIONS / LENGTH_M)
    return Mode(10.0 * number**2, "vertical", LENGTH_M / 2 / number, STATIONS, shape)


@pytest.mark.parametrize("number", [1, 2, 3, 4])
def test_nodes_of_half_waves_lie_at_their_ends(number):
    """sin(n pi x / L) is zero at k L / n."""
    expected = [k * LENGTH_M / number for k in range(1, number)]
    assert nodes(half_waves(number), (0.0, LENGTH_M)) == pytest.approx(expected, abs=0.03)


@pytest.mark.parametrize("number", [1, 2, 3])
def test_antinodes_of_half_waves_lie_in_their_middle(number):
    """sin(n pi x / L) is one at (k - 1/2) L / n."""
    expected = [(k - 0.5) * LENGTH_M / number for k in range(1, number + 1)]
    assert sorted(antinodes(half_waves(number))) == pytest.approx(expected, abs=0.06)


def test_a_node_at_a_support_is_the_support_and_not_told():
    assert nodes(half_waves(2), (0.0, 3.0, LENGTH_M)) == ()


def test_a_bend_of_direction_is_no_node():
    """A shape that turns from z to y on the way never passes through zero."""
    angle = np.linspace(0, np.pi / 2, len(STATIONS))
    shape = np.column_stack([np.zeros_like(angle), np.sin(angle), np.cos(angle)])
    assert nodes(Mode(1.0, "vertical", 1.0, STATIONS, shape)) == ()


def test_the_place_to_tap_shows_the_first_two_half_waves_alike():
    """|sin x| and |sin 2x| meet at x = pi/3, where both are 0.866 of their largest."""
    found = tap_place([half_waves(1), half_waves(2)])
    assert min(abs(found.at_m - LENGTH_M / 3), abs(found.at_m - 2 * LENGTH_M / 3)) < 0.051
    assert found.share == pytest.approx(np.sin(np.pi / 3), abs=0.03)
    assert found.shows_all
    assert found.modes == 2


def test_the_place_to_tap_keeps_out_of_what_is_forbidden():
    found = tap_place([half_waves(1)], [(1.0, 5.0)])
    assert not 1.0 <= found.at_m <= 5.0
    assert found.share == pytest.approx(np.sin(np.pi / 6), abs=0.03)


def test_the_weakest_mode_is_named():
    """At L/3 the third half wave stands still; a mode of another axis moves there all the same."""
    found = tap_place([half_waves(1), half_waves(3, axis=1)], [(0.0, 1.9), (2.1, 6.0)])
    assert found.weakest == 2
    assert not found.shows_all


def test_no_mode_or_no_place_gives_no_answer():
    assert tap_place([]) is None
    assert tap_place([half_waves(1)], [(-1.0, 7.0)]) is None
