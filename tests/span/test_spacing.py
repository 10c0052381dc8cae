"""Looking up the suggested support spacing."""

import pytest

from fieldkit.span.spacing import spacing_by_diameter, suggested_spacing_m


@pytest.mark.parametrize("written", ["NPS 1-1/2", "nps 1-1/2", "1-1/2", "1 1/2"])
def test_a_size_is_found_however_it_is_written(written):
    """Trade spellings of one size."""
    spacing = suggested_spacing_m(written)
    assert spacing is not None
    assert spacing.size == "NPS 1-1/2"


def test_diameter_finds_the_nominal_size():
    """The two standards round NPS 10 to 273.0 and 273.1 mm."""
    for diameter in (0.2730, 0.2731):
        spacing = spacing_by_diameter(diameter)
        assert spacing is not None
        assert spacing.size == "NPS 10"


def test_what_the_table_lacks_is_none():
    """No guess between the sizes, nor past the ends."""
    assert suggested_spacing_m("NPS 5") is None
    assert spacing_by_diameter(0.1413) is None
    assert spacing_by_diameter(1.2) is None


def test_larger_pipe_spans_further():
    """Both columns rise with size, and gas lines span at least as far as water lines."""
    sizes = ("1/2", "1", "2", "3", "4", "6", "8", "10", "12", "16", "20", "24")
    found = [suggested_spacing_m(size) for size in sizes]
    assert sorted(s.water_m for s in found) == [s.water_m for s in found]
    assert all(s.gas_m > s.water_m for s in found)
