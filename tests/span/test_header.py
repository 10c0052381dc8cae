"""A branch on a header: the shell's give, and who may stand on what."""

from dataclasses import replace

import pytest

from fieldkit.errors import InputError
from fieldkit.span.header import check_header, shell_factors, shell_rotation_n_m_per_rad
from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.modes import span_modes
from fieldkit.span.pipes import PipeSection, standard_pipe
from fieldkit.span.supports import KINDS, UNKNOWN_SD_LN, on_header, springs

HEADER, BRANCH = standard_pipe("NPS 8", "40"), standard_pipe("NPS 1", "80")


def span(**support) -> Span:
    return Span(
        BRANCH,
        material("carbon steel"),
        (Leg((0.0, 1.0, 0.0), 0.45),),
        (Support(0.0, "branch", **support),),
        (PointMass(0.38, 3.5),),
    )


def test_factors_by_hand():
    """ASME III NB-3687.5 (from memory) for NPS 1 Sch 80 on NPS 8 Sch 40: D/T 26.785,
    sqrt((T/t)(d/D)) 0.52355, t/T 0.55623."""
    along, across = shell_factors(HEADER, BRANCH)
    assert along == pytest.approx(0.1 * 26.785**1.5 * 0.52355 * 0.55623, rel=1e-3)
    assert across == pytest.approx(0.2 * 26.785 * 0.52355 * 0.55623, rel=1e-3)


def test_shell_turns_by_k_m_d_over_e_i():
    """The geometric mean of the two directions."""
    along, across = shell_factors(HEADER, BRANCH)
    k = (along * across) ** 0.5
    expected = 200e9 * BRANCH.second_moment_m4 / (k * BRANCH.outside_diameter_m)
    assert shell_rotation_n_m_per_rad(HEADER, BRANCH, 200e9) == pytest.approx(expected)


def test_a_header_of_known_size_sets_the_rocking():
    """In place of the prior in 4 EI/L; the word unknown still widens the doubt."""
    known = {s.axis: s for s in springs(span(header=HEADER))}["rotation"]
    modulus = material("carbon steel").modulus_pa[0][1]
    assert known.stiffness == pytest.approx(shell_rotation_n_m_per_rad(HEADER, BRANCH, modulus))
    widened = {s.axis: s for s in springs(span(header=HEADER, rotation="unknown"))}["rotation"]
    assert widened.sd_ln == UNKNOWN_SD_LN > known.sd_ln
    stated = {s.axis: s for s in springs(span(header=HEADER, rotation=5e4))}["rotation"]
    assert (stated.stiffness, stated.sd_ln) == (5e4, 0.0)


def test_a_thinner_header_lets_the_branch_shake_slower():
    """Same branch on 8 inch walls of schedule 80 and 10."""
    state, found = State("running"), []
    for schedule in ("80", "40", "10"):
        header = standard_pipe("NPS 8", schedule)
        found.append(span_modes(span(header=header), state, 500.0)[0].frequency_hz)
    assert found == sorted(found, reverse=True)
    assert found[0] > 1.1 * found[-1]


def test_limits_of_the_formula_are_refused():
    with pytest.raises(InputError, match="half as wide"):
        check_header(standard_pipe("NPS 2", "40"), standard_pipe("NPS 1-1/2", "40"))
    with pytest.raises(InputError, match="thinner"):
        check_header(PipeSection(0.6, 0.005), BRANCH)


def test_a_brace_holds_every_way_and_turns_with_nothing():
    brace = KINDS["brace"]
    assert all((brace.vertical, brace.lateral, brace.axial))
    assert brace.rotation is None
    assert on_header(span())
    assert not on_header(replace(span(), supports=(Support(0.0, "anchor"),)))
