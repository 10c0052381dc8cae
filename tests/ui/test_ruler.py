"""The ruler tells where modes stand against the bands, by glyph and place as well as by colour."""

import pytest
from textual.app import App

from fieldkit.detune.excitation import Excitation, bands
from fieldkit.ui.widgets import FrequencyRuler, RulerData
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ruler_art import GUTTER, draw_ruler

BANDS = bands(
    [Excitation("pump", (24.0, 25.0), (1, 2)), Excitation("ripple", frequency_hz=(100.0, 100.0))],
    0.2,
)
DATA = RulerData(
    200.0,
    BANDS,
    (31.2, 58.0, 150.0),
    ((44.0, 46.2, 48.8), (66.0, 70.0, 82.0)),
    ((136.0, 140, 144),),
)


def lines(data=DATA, columns=109, rows=5):
    canvas = Canvas(columns, rows)
    draw_ruler(canvas, data)
    return canvas.lines()


def column(frequency_hz, columns=109):
    return GUTTER + int(frequency_hz / 200.0 * (columns - GUTTER))


def test_rows_are_named_and_in_order():
    names = [line[:GUTTER].strip() for line in lines()]
    assert names == ["keep out", "measured", "now", "after", "Hz"]


def test_each_mode_stands_at_its_frequency_with_its_number():
    measured, now = lines()[1:3]
    assert measured[column(31.2)] == "◇"
    assert measured[column(150.0)] == "◇"
    assert now[column(46.2)] == "●"
    assert "46.2" in now


def test_the_glyph_tells_clear_touching_and_inside():
    """58 Hz lies within 20 % of 50 Hz, 31.2 Hz of none; 82 Hz, the upper end of 70 Hz, within 20 %
    of 100 Hz."""
    _, measured, now, after, _ = lines()
    assert measured[column(58.0)] == "◆"
    assert measured[column(31.2)] == "◇"
    assert now[column(70.0)] == "◐"
    assert after[column(140.0)] == "△"


def test_doubt_is_a_bar_from_low_to_high():
    now = lines()[2]
    assert now[column(44.0)] == "━"
    assert now[column(48.5)] == "━"
    assert "━" not in now[: column(44.0)]


def test_bands_are_hatched_on_every_row_and_the_excitation_is_darker():
    picture = lines()
    for row in picture[1:4]:
        assert row[column(96.0)] == "╱"
        assert row[column(100.0)] == "▒"
        assert row[column(125.0)] != "╱"
    assert "pump 1x" in picture[0]
    assert "ripple" in picture[0]


def test_rows_without_data_say_so():
    text = "\n".join(lines(RulerData(200.0)))
    for words in ("nothing measured yet", "not computed yet", "no change chosen"):
        assert words in text


def test_modes_beyond_the_end_are_counted():
    measured = lines(RulerData(200.0, (), (50.0, 230.0, 260.0)))[1]
    assert measured.endswith("2▸")


def test_bare_frequencies_serve_where_there_is_no_doubt():
    assert lines(RulerData(200.0, (), (), (46.2,)))[2][column(46.2)] == "○"


@pytest.mark.parametrize("columns", [0, 1, 5, 11, 12, 39, 80])
@pytest.mark.parametrize("rows", range(8))
def test_no_size_is_too_small(columns, rows):
    for data in (DATA, RulerData(0.0), RulerData(200.0)):
        assert [len(line) for line in lines(data, columns, rows)] == [columns] * rows


def test_rows_go_in_order_of_need():
    """With little height the modes now stay longest, then those after the change."""
    assert "46.2" in lines(rows=1)[0]
    assert "46.2" in lines(rows=2)[0]
    assert "140" in lines(rows=3)[1]
    assert "31.2" in lines(rows=4)[0]


async def test_the_widget_shows_what_it_is_given():
    class Host(App):
        def compose(self):
            yield FrequencyRuler()

    app = Host()
    async with app.run_test(size=(109, 5)) as pilot:
        ruler = app.query_one(FrequencyRuler)
        assert "not computed yet" in ruler.render_line(2).text
        ruler.show(DATA)
        await pilot.pause()
        assert [ruler.render_line(y).text for y in range(5)] == lines()
