"""Every way a job file can be wrong has its sentence, with file, line and key."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.job.schema import load_job, parse_job
from tests.job.sample import FULL, SMALL

PATH = Path("plant/job.toml")


def refusal(text: str) -> InputError:
    with pytest.raises(InputError) as caught:
        parse_job(text, PATH)
    return caught.value


# (what to replace, by what, key in the message, part of the sentence)
WRONG_VALUES = [
    ('at = "4.0 m"', 'at = "44 m"', "support[1].at",
     "support at 44 m lies outside the span, which runs from 0 to 5.3 m; correct the station"),
    ('at = "2.6 m"', 'at = "6 m"', "mass[0].at", "lies outside the span"),
    ('at = "1.9 m"', 'at = "9 m"', "recording[0].at", "beyond the end of the span at 5.3 m"),
    ('schedule = "40"', 'schedule = "41"', "pipe.schedule",
     "NPS 3 does not exist in schedule '41'; it exists in"),
    ('size = "NPS 3"', 'size = "NPS 7"', "pipe.size", "there is no standard pipe size 'NPS 7'"),
    ('size = "NPS 3"', 'size = "NPS 3"\noutside_diameter = "88.9 mm"', "pipe.size",
     "it has both size and outside_diameter"),
    ('schedule = "40"', 'schedule = "40"\nwall = "5 mm"', "pipe.schedule",
     "both schedule and wall"),
    ('size = "NPS 3"', 'outside_diameter = "88.9 mm"', "pipe.schedule",
     "a schedule belongs to a standard size"),
    ('schedule = "40"', 'wall = "60 mm"', "pipe.wall",
     "does not fit an outside diameter of 88.9 mm"),
    ('schedule = "40"', "wall = 5.49", "pipe.wall",
     "5.49 is not above 0 m and at most 5.0 m; write '4.2 m', '88.9 mm'"),
    ('"carbon steel"', '"unobtainium"', "pipe.material", "no material is called 'unobtainium'"),
    ('"carbon steel"', "7", "pipe.material", "7 is not text; put it in quotes"),
    ('"carbon steel"', '{ density = 7850, poisson = 0.3 }', "pipe.material.elastic_modulus",
     "elastic_modulus is missing; write elastic_modulus = \"200 GPa\""),
    ('"carbon steel"', '{ elastic_modulus = "200 GPa", density = 7850, poisson = 3 }',
     "pipe.material.poisson", "3 is not at least 0 % and at most 50 %"),
    ('name = "water"', 'name = "lava"', "contents.name", "no contents are called 'lava'"),
    ('name = "water"', "", "contents", "[contents] names nothing; write name"),
    ('[contents]\nname = "water"', "", "state.running.fill",
     "it says the pipe is filled, and the job names no contents"),
    ("fill = 1.0", "fill = 100", "state.running.fill", "100 is not at least 0 % and at most 100 %"),
    ("fill = 0.0", "fill = [0.8, 0.2]", "state.tapped.fill",
     "0.8 is not below 0.2; write the lower one first"),
    ("fill = 0.0", "fill = [0.1, 0.2, 0.3]", "state.tapped.fill", "a list is not a pair"),
    ('"65 degC"', "65", "state.running.temperature",
     "a bare 65 leaves its unit open; write '65 degC' or '65 K'"),
    ('"65 degC"', '"1800 degC"', "state.running.temperature",
     "the modulus of carbon steel is not known at 1800 degC"),
    ('"6 bar"', '"6 bara"', "state.running.pressure", "this is an absolute pressure"),
    ('"+z"', '"up"', "leg[1].direction", "'up' is not a direction; write one of +x, -x"),
    ('"+z"', "[0, 0, 0]", "leg[1].direction", "this direction has no length"),
    ('"+z"', "[0, 1]", "leg[1].direction", "a list is not a direction"),
    ('"+z"', "[0, 1, nan]", "leg[1].direction", "this direction has no length"),
    ('"+z"', '"-x"', "leg[1].direction", "this leg runs straight back along the one before"),
    ('"1.1 m"', '"0 m"', "leg[1].length", "'0 m' is not at least 1.0 mm and at most 1000 m"),
    ('"1.1 m"', '"-1 m"', "leg[1].length", "'-1 m': a length cannot be negative"),
    ('"1.1 m"', '"1.1 kg"', "leg[1].length", "'kg' is the unit of a mass, not of a length"),
    ('"1.1 m"', "true", "leg[1].length", "true is not a length; write '4.2 m'"),
    ('"1.1 m"', "nan", "leg[1].length", "nan is not a finite number"),
    ('"1.1 m"', "inf", "leg[1].length", "inf is not a finite number"),
    ('"1.1 m"', "1979-05-27", "leg[1].length", "1979-05-27 is not a length"),
    ('"1.1 m"', '"0.1 m"', "leg[1].length", "the bends take 0.114 m of a leg only 0.100 m long"),
    ('"114 mm"', '"10 mm"', "leg[1].bend_radius", "does not fit a pipe of 88.9 mm"),
    ('length = "4.2 m"', 'length = "4.2 m"\nbend_radius = "114 mm"', "leg[0].bend_radius",
     "the first leg has no bend before it; move bend_radius"),
    ('kind = "clamp"', 'kind = "clmp"', "support[1].kind",
     "'clmp' is not a kind of support; did you mean 'clamp'? use anchor, nozzle, clamp, u-bolt, "
     "guide, rest, hanger, branch, brace or free"),
    ('"2 MN/m"', '"-2 MN/m"', "support[1].lateral", "a stiffness cannot be negative"),
    ('"2 MN/m"', '"stiff"', "support[1].lateral", 'or "rigid", "free" or "unknown"'),
    ('"2 MN/m"', '"2 MN"', "support[1].lateral", "'MN' is the unit of a force, not of a stiffness"),
    ('rotation = "rigid"', 'rotation = "2 MN/m"', "support[1].rotation",
     "'MN/m' is the unit of a stiffness, not of a rotational stiffness"),
    ('axial = "free"', 'z = "1 MN/m"', "support[1].z", "vertical and z hold the same direction"),
    ('mass = "24 kg"', 'mass = "-24 kg"', "mass[0].mass", "a mass cannot be negative"),
    ('mass = "24 kg"', 'mass = "24 m"', "mass[0].mass", "'m' is the unit of a length"),
    ("tolerance = 0.15", "tolerance = 15", "mass[0].tolerance", "at most 100 %"),
    ('["0 m", "0 m", "0.18 m"]', '["0.18 m"]', "mass[0].offset", "a list is not an offset"),
    ('["0 m", "0 m", "0.18 m"]', '["0 m", "0 m", 180]', "mass[0].offset", "180 is not at least"),
    ('["1450 rpm", "1495 rpm"]', '["1495 rpm", "1450 rpm"]', "excitation[0].speed",
     "'1495 rpm' is not below '1450 rpm'; write the lower one first"),
    ('["1450 rpm", "1495 rpm"]', "1480", "excitation[0].speed",
     "a bare 1480 leaves its unit open; write '1480 rpm' or '1480 Hz'"),
    ('["1450 rpm", "1495 rpm"]', '"0 rpm"', "excitation[0].speed", "a machine at rest"),
    ("orders = [1, 2, 6]", 'frequency = "25 Hz"', "excitation[0].frequency",
     "it has both speed and frequency"),
    ('frequency = "100 Hz"', "", "excitation[1]", "its speed is missing; write speed"),
    ('frequency = "100 Hz"', 'frequency = "100 Hz"\norders = [1]', "excitation[1].orders",
     "orders belong to a speed"),
    ("orders = [1, 2, 6]", "orders = []", "excitation[0].orders", "orders is empty"),
    ("orders = [1, 2, 6]", "orders = [1, -2]", "excitation[0].orders[1]", "-2 is not an order"),
    ("orders = [1, 2, 6]", "orders = 1", "excitation[0].orders", "1 is not a list"),
    ('kind = "tap"', 'kind = "hammer"', "recording[0].kind",
     "'hammer' is not a kind of recording; use tap or running"),
    ('kind = "tap"\n', "", "recording[0].kind", 'kind is missing; write kind = "tap"'),
    ('file = "tap-1.flac"', 'file = ""', "recording[0].file", "file is empty"),
    ('file = "tap-1.flac"', 'file = "a\\u0000b"', "recording[0].file", "control characters"),
    ('state = "tapped"\nchannel', 'state = "hot"\nchannel', "recording[0].state",
     "'hot' is not a state; use tapped or running"),
    ("channel = 1", "channel = 0", "recording[0].channel", "0 is not a whole number from 1"),
    ("channel = 1", "channel = 1.5", "recording[0].channel", "1.5 is not a whole number"),
    ('"acceleration"', '"jerk"', "recording[0].quantity", "'jerk' is not a measured quantity"),
    ('full_scale = "1.4 V"', 'scale = "9.81 m/s^2 per unit"', "recording[0].scale",
     "it has both a scale and a sensitivity"),
    ('sensitivity = "100 mV/g"\n', "", "recording[0].full_scale", "full_scale without sensitivity"),
    ('"100 mV/g"', '"50 mV/Pa"', "recording[0].sensitivity",
     "'mV/Pa' is the unit of a sensitivity to sound pressure"),
    ('"1.4 V"', '"0 V"', "recording[0].full_scale", "'0 V' is not above zero"),
    ('"1.4 V"', "[1.4]", "recording[0].full_scale", "a list is not a quantity"),
    ('direction = "vertical"\nat', 'direction = "sideways"\nat', "recording[0].direction",
     "'sideways' is not a direction; use vertical, lateral, axial, x, y or z"),
    ('frequency = "23.4 Hz"', 'frequency = "0 Hz"', "measured[0].frequency", "is not above 0 Hz"),
    ('sd = "0.1 Hz"', 'sd = "30 Hz"', "measured[0].sd", "as large as the frequency"),
    ("damping = 0.011", "damping = 1.1", "measured[0].damping", "below 100 %"),
    ("margin = 0.2", "margin = 1.0", "goal.margin", "at least 0 % and below 100 %"),
    ("chance = 0.9", "chance = 1", "goal.chance", "above 0 % and below 100 %"),
    ('up_to = "200 Hz"', 'up_to = "20 MHz"', "goal.up_to", "too large to be a frequency"),
    ('["support", "mass"]', '["support", "prayer"]', "goal.allow[1]",
     "'prayer' is not a kind of change; use support, move, stiffen, mass, speed or absorber"),
    ('[["1.0 m", "1.6 m"]]', '["1.0 m", "1.6 m"]', "goal.keep_out[0]", "'1.0 m' is not a pair"),
    ('[["1.0 m", "1.6 m"]]', '[["1.6 m", "1.0 m"]]', "goal.keep_out[0]", "is not below"),
    ('[["1.0 m", "1.6 m"]]', '[["10 m", "16 m"]]', "goal.keep_out[0]", "beyond the end"),
    ('[["2 m", "3 m"]]', '["2 m", "3 m"]', "goal.steel[0]", "'2 m' is not a pair"),
    ('[["2 m", "3 m"]]', '[["3 m", "2 m"]]', "goal.steel[0]", "is not below"),
    ('[["2 m", "3 m"]]', '[["20 m", "30 m"]]', "goal.steel[0]", "beyond the end"),
    ('[["2 m", "3 m"]]', '[["2 kg", "3 kg"]]', "goal.steel[0]", "'2 kg' is not a length"),
    ('units = "SI"', 'units = "metric"', "units",
     "'metric' is not a system of units; use SI or US"),
    ("fieldkit = 1", "fieldkit = 2", "fieldkit", "this fieldkit reads format 1"),
    ("fieldkit = 1", 'fieldkit = "1"', "fieldkit", "'1' is not 1"),
    ("fieldkit = 1", "", "fieldkit", "does not say that it is a job file; write fieldkit = 1"),
    ('title = "Glycol booster, discharge line"', "title = 7", "title", "7 is not text"),
    ('title = "Glycol booster, discharge line"', f'title = "{"x" * 300}"', "title",
     "longer than 200"),
    # unknown keys
    ('at = "4.0 m"', 'att = "4.0 m"', "support[1].att",
     "'att' is not a key of [support]; did you mean at?"),
    ('title = "', 'titel = "', "titel", "'titel' is not a key of a job; did you mean title?"),
    ("fill = 0.0", "fills = 0.0", "state.tapped.fills", "did you mean fill?"),
    ("[goal]", "[gaol]", "gaol", "'gaol' is not a key of a job; did you mean goal?"),
    ("[state.running]", "[state.runing]", "state.runing", "did you mean running?"),
    ('thickness = "50 mm"', 'thick = "50 mm"', "pipe.insulation.thick", "did you mean thickness?"),
    ("margin = 0.2", "zzz = 0.2", "goal.zzz", "its keys are margin, margin_measured"),
    ("margin = 0.2", '"\\u001b[31m" = 1', "goal.'\\x1b[31m'", "'\\x1b[31m' is not a key of [goal]"),
    # what must be there
    ('length = "1.1 m"\n', "", "leg[1].length", 'length is missing; write length = "4.2 m"'),
    ('at = "4.0 m"\n', "", "support[1].at", 'at is missing; write at = "4.1 m"'),
    ('kind = "clamp"\n', "", "support[1].kind", 'kind is missing; write kind = "clamp"'),
    ('mass = "24 kg"\n', "", "mass[0].mass", "mass is missing"),
    ('schedule = "40"', "", "pipe.schedule", "its wall is missing"),
    ('size = "NPS 3"\n', "", "pipe.size", "its size is missing"),
    ('material = "carbon steel"\n', "", "pipe.material", "material is missing"),
    ('file = "tap-1.flac"\n', "", "recording[0].file", "file is missing"),
]  # fmt: skip


@pytest.mark.parametrize(("old", "new", "field", "sentence"), WRONG_VALUES)
def test_a_wrong_value_is_named_with_its_place(
    old: str, new: str, field: str, sentence: str
) -> None:
    """One sentence: file, line, key, what is wrong, what to write."""
    assert FULL.count(old) >= 1
    text = FULL.replace(old, new, 1)
    error = refusal(text)
    assert error.place.field == field
    assert sentence in str(error)
    assert str(error).startswith(f"plant/job.toml, line {error.place.line}, {field}: ")
    assert str(error).isprintable()
    assert error.remedy


@pytest.mark.parametrize(
    ("field", "line"),
    [
        ("support[1].at", 'at = "4.0 m"'),
        ("leg[1].length", 'length = "1.1 m"'),
        ("state.running.pressure", 'pressure = "6 bar"'),
        ("excitation[1].frequency", 'frequency = "100 Hz"'),
        ("pipe.insulation.density", "insulation ="),
    ],
)
def test_the_line_is_the_line_of_the_key(field: str, line: str) -> None:
    """The number leads to the line that has to be changed."""
    old = line if "=" in line and not line.endswith("=") else 'density = "130 kg/m^3"'
    key = old.split(" = ")[0]
    text = FULL.replace(old, f'{key} = "6 furlong"')
    error = refusal(text)
    assert error.place.field == field
    assert text.splitlines()[(error.place.line or 0) - 1].startswith(line.split(" = ")[0])


def test_a_missing_key_is_placed_at_its_table() -> None:
    """What is not there is placed where it ought to be."""
    text = FULL.replace('at = "4.0 m"\n', "")
    line = refusal(text).place.line or 0
    assert text.splitlines()[line - 1 : line + 1] == ["[[support]]", 'kind = "clamp"']


def test_the_first_of_several_faults_is_told() -> None:
    """Faults are told in the order of the file."""
    text = FULL.replace('"1.1 m"', '"1.1 kg"').replace("margin = 0.2", "margin = 20")
    assert refusal(text).place.field == "leg[1].length"


@pytest.mark.parametrize(
    ("text", "field", "sentence"),
    [
        (SMALL.replace("[[support]]", "[[excitation]]").replace('at = "0 m"\nkind = "anchor"',
         'frequency = "9 Hz"'), "support", "the job has no [[support]]; add [[support]] with at"),
        ("fieldkit = 1\n", "pipe", "the job has no [pipe]; add [pipe] with size"),
        (SMALL.replace("[[leg]]", "[leg]"), "leg", "write [[leg]], with two brackets"),
        (SMALL.replace('[[support]]\nat = "0 m"\nkind = "anchor"', "").replace("[pipe]",
         "support = []\n[pipe]"), "support", "support is empty; write [[support]] with at"),
        (SMALL.replace("[[support]]", "[[supports]]"), "supports", "did you mean support?"),
        (SMALL.replace("[pipe]", "[[pipe]]"), "pipe", "a list is not a table"),
        (SMALL + '[[support]]\nat = "0 m"\nkind = "rest"\n' * 250, "support", "longer than 200"),
        (SMALL + "[state]\ntapped = 3\n", "state.tapped", "3 is not a table"),
    ],
)  # fmt: skip
def test_tables_that_are_missing_or_of_the_wrong_kind(text: str, field: str, sentence: str) -> None:
    """Whole tables are asked for by name and with an example."""
    error = refusal(text)
    assert error.place.field == field
    assert sentence in str(error)


@pytest.mark.parametrize(
    ("old", "new", "line_text", "sentence"),
    [
        ('length = "1.1 m"', "length = 1.1 m", "length = 1.1 m",
         "'length = 1.1 m' is not valid TOML"),
        ('length = "1.1 m"', 'length = "1.1 m', 'length = "1.1 m', "its closing quote is missing"),
        ('length = "1.1 m"', 'length = "1.1 m"\nlength = "2 m"', 'length = "2 m"',
         "'length = \"2 m\"' is given a second time; keep one of the two"),
        ("[goal]", "[pipe]", "[pipe]", "'[pipe]' is given a second time"),
        ("[goal]", "[goal", "[goal", "is not valid TOML"),
        ("margin = 0.2", "margin 0.2", "margin 0.2", "is not valid TOML"),
        ("margin = 0.2", "margin = 0.2\x00", "margin = 0.2\x00", "is not valid TOML"),
    ],
)  # fmt: skip
def test_text_that_is_not_toml(old: str, new: str, line_text: str, sentence: str) -> None:
    """Syntax errors and doubled keys name their line."""
    text = FULL.replace(old, new, 1)
    error = refusal(text)
    assert sentence in str(error)
    assert text.split("\n")[(error.place.line or 0) - 1] == line_text
    assert error.place.field
    assert str(error).isprintable()


def test_a_doubled_key_names_the_table_it_stands_in() -> None:
    """The key path of a syntax error counts its table."""
    text = FULL.replace('length = "1.1 m"', 'length = "1.1 m"\nlength = "2 m"')
    assert refusal(text).place.field == "leg[1].length"


@pytest.mark.parametrize(
    "nonsense",
    [
        "[" * 100_000,
        "x = " + "[" * 5000 + "]" * 5000,
        "x = " + "9" * 5000,
        "x = 9999-99-99",
        "fieldkit = 1\nleg = " + "[" * 90 + "]" * 90,
        "fieldkit = 1e400",
        "fieldkit = true",
        "= 1",
        "a.b.c.d.e.f = 1",
        "",
        "\ud7ff",
        "RIFF\x00\x00WAVEfmt ",
    ],
)
def test_nonsense_is_refused_as_input(nonsense: str) -> None:
    """Deep, huge or foreign text is a bad job, never a fault of the program."""
    assert str(refusal(nonsense)).isprintable()


@given(st.text(max_size=60))
@settings(max_examples=100, deadline=None)
def test_any_text_is_refused_as_input(text: str) -> None:
    """Whatever the text, the answer is a sentence."""
    assert str(refusal("fieldkit = 1\n" + text)).isprintable()


def replaced(table: str, new: str) -> str:
    lines = FULL.splitlines()
    i = next(i for i, line in enumerate(lines) if line.startswith(table))
    return "\n".join([*lines[:i], f"{table}{new}", *lines[i + 1 :]])


KEYS = sorted({line.split("=")[0] + "= " for line in FULL.splitlines() if "=" in line})
odd = st.sampled_from(
    ["true", "-1", "nan", "inf", "-inf", "1e308", "[]", "{}", '""', "[[1]]", "{ a = 1 }", "[true]",
     "1979-05-27", '"\\u0000"', '"-1 m"', '"1e300 kg"', '["a", "b"]', "99999999999999999999"]
)  # fmt: skip


@given(st.sampled_from(KEYS), odd)
@settings(max_examples=120, deadline=None)
def test_an_odd_value_anywhere_is_read_or_refused(key: str, value: Any) -> None:
    """No value of any key does anything else than make a job or a sentence with its place."""
    try:
        parse_job(replaced(key, value), PATH)
    except InputError as error:
        place = error.place
        complete = place.file == PATH and place.line and place.field
        if not complete or not str(error).isprintable():
            raise AssertionError(repr(error)) from error


def test_a_key_of_thousands_of_parts_is_refused_unread() -> None:
    """Read, it would take gigabytes."""
    error = refusal(FULL + f"\n[{'.'.join(['a'] * 20_000)}]\n")
    assert "a line of 40,001 characters is far too long for a job file" in str(error)
    assert error.place.line == len(FULL.splitlines()) + 2


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    """Missing file, folder, other encodings and other kinds of file."""
    utf16 = tmp_path / "utf16.toml"
    utf16.write_bytes(FULL.encode("utf-16"))
    latin = tmp_path / "latin.toml"
    latin.write_bytes(FULL.replace("Glycol", "Gl\u00fchol").encode("latin-1"))
    huge = tmp_path / "huge.wav"
    huge.write_bytes(b"\0" * 1_000_001)
    pipe = tmp_path / "pipe.toml"
    os.mkfifo(pipe)
    cases = {
        pipe: "this is not a regular file; name a job file on disk",
        tmp_path / "no.toml": "there is no such file; check the name and the folder",
        tmp_path: "this is a folder, not a job file; name the job file in it",
        utf16: "line 1: this is not UTF-8 text; save it from the editor as UTF-8",
        latin: "line 2: this is not UTF-8 text",
        huge: "far too large to be a job file",
        Path("a\0b"): "it cannot be read",
        tmp_path / "no.toml" / "x": "there is no such file",
    }
    for path, sentence in cases.items():
        with pytest.raises(InputError) as caught:
            load_job(path)
        assert sentence in str(caught.value)
        assert caught.value.place.file == path
