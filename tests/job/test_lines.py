"""Where keys stand in a TOML text."""

from __future__ import annotations

import tomllib
from typing import Any

import tomlkit
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.job.lines import Loc, field_loc, field_name, places
from tests.job.sample import FULL

AWKWARD = '''\
a = 1
b.c = "x" # not = "this"
"q.r" = 'k = 1'
[t . u]
v = """
w = 1
[x]
""\\"""""
y = [1, # one ]
  [2, 3], { z = "}" }]
[[leg]]
[[leg]]
e = { f = { g = 1 }, "h i" = 2 }
[leg.sub]
j = 1979-05-27 07:32:00 # date
[[leg.part]]
k = 1
[[leg.part]]
k = 2
'''

LINES = {
    "a": 1,
    "b.c": 2,
    "t": 4,
    "t.u.v": 5,
    "t.u.y": 9,
    "t.u.y[1][0]": 10,
    "t.u.y[2].z": 10,
    "leg": 11,
    "leg[0]": 11,
    "leg[1].e": 13,
    "leg[1].e.f.g": 13,
    "leg[1].sub.j": 15,
    "leg[1].part[1].k": 19,
    "leg[1].missing": 12,
    "missing": 1,
}


def test_finds_the_line_of_every_kind_of_key() -> None:
    """Headers, arrays of tables, inline tables, dotted and quoted keys, strings over lines."""
    found = places(AWKWARD)
    assert {name: found.line(field_loc(name)) for name in LINES} == LINES
    assert found.line(("q.r",)) == 3
    assert found.line(("leg", 1, "e", "h i")) == 13


def values(table: Any, loc: Loc = ()) -> dict[Loc, Any]:
    """Every value of a parsed table by its path, containers included."""
    pairs = table.items() if isinstance(table, dict) else enumerate(table)
    found: dict[Loc, Any] = {}
    for key, value in pairs:
        found[(*loc, key)] = value
        if isinstance(value, (dict, list)):
            found |= values(value, (*loc, key))
    return found


def assert_spans_hold_values(text: str) -> None:
    """Each span, read on its own, is the value that the parser found under that path."""
    parsed = values(tomllib.loads(text))
    spots = [spot for spot in places(text).spots if spot.kind != "header"]
    for spot in spots:
        written = text[spot.value_start : spot.end]
        assert tomllib.loads(f"v = {written}")["v"] == parsed[spot.loc], spot
    leaves = {loc for loc, value in parsed.items() if not isinstance(value, (dict, list))}
    assert leaves <= {spot.loc for spot in spots}


def test_spans_hold_exactly_the_values() -> None:
    """The offsets used for editing enclose the value and nothing else."""
    assert_spans_hold_values(AWKWARD)
    assert_spans_hold_values(FULL)
    assert_spans_hold_values(FULL.replace("\n", "\r\n"))


scalars = st.one_of(
    st.text(max_size=8), st.integers(-99, 99), st.booleans(), st.floats(-9, 9, allow_nan=False)
)
trees = st.recursive(
    scalars,
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=4), inner, max_size=3)
    ),
    max_leaves=8,
)


@given(st.dictionaries(st.text(max_size=4), trees, max_size=4))
@settings(max_examples=40, deadline=None)
def test_spans_hold_the_values_of_any_document(table: dict[str, Any]) -> None:
    """Whatever keys and strings a file holds, the scanner reads it as the parser does."""
    assert_spans_hold_values(tomlkit.dumps(table))


@given(st.text("a=[]{}\"'#,.\n1 ", max_size=30))
@settings(max_examples=150, deadline=None)
def test_scanning_broken_text_ends(text: str) -> None:
    """Text that is not TOML stops the scanner and never traps it."""
    assert places(text).line(("a",)) >= 1


def test_field_names_read_back() -> None:
    """A key path survives being written as a field name; odd keys stay printable."""
    for name in ("title", "support[1].at", "state.running.fill", "goal.keep_out[0]"):
        assert field_name(field_loc(name)) == name
    assert field_name(("leg", 0, "\x1b[31m")).isprintable()
