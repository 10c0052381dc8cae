"""Tables draw what they were filled with, however soon."""

from __future__ import annotations

from textual.app import App, ComposeResult

from fieldkit.ui.table import Table


class Bare(App[None]):
    def compose(self) -> ComposeResult:
        yield Table("on", "as typed")


async def test_a_row_is_never_drawn_cut_to_the_width_of_the_rows_before():
    """A row drawn before the table was idle would stay as it was drawn."""
    app = Bare()
    async with app.run_test() as pilot:
        table = app.query_one(Table)
        table.fill([("0", ("new", "type"))])
        await pilot.pause()
        table.fill([("0", ("Support 1", "at 0 m, anchor")), ("1", ("new", "type"))])
        drawn = [table.render_line(row).text for row in range(3)]
        assert any("Support 1" in line and "at 0 m, anchor" in line for line in drawn)
