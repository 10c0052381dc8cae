"""The job text: edited key by key, saved whole, everything else left as the user wrote it."""

from __future__ import annotations

import difflib
import os
import stat
import tomllib
from pathlib import Path
from typing import Any

import pytest
import tomlkit
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.job.schema import load_job, parse_job
from fieldkit.job.store import JobText, load_text, new_job_text
from tests.job.sample import FULL, SMALL


def changed_lines(before: str, after: str) -> list[str]:
    """Lines taken out (-) and put in (+), in order."""
    lines = difflib.ndiff(before.splitlines(keepends=True), after.splitlines(keepends=True))
    return [line.rstrip("\r\n") for line in lines if line[0] in "+-"]


@pytest.fixture
def job() -> JobText:
    return JobText(FULL)


def test_an_edited_value_changes_its_own_characters_only(job: JobText) -> None:
    """Comment, blanks and order stay."""
    after = job.with_value("pipe.schedule", "80")
    assert changed_lines(FULL, after.text) == [
        '- schedule = "40"  # stamped on the pipe',
        '+ schedule = "80"  # stamped on the pipe',
    ]
    assert job.text == FULL


def test_an_inline_value_is_edited_in_its_line(job: JobText) -> None:
    """Inside an inline table and an array of tables."""
    after = job.with_value("pipe.insulation.density", "8 lb/ft^3")
    assert '{ thickness = "50 mm", density = "8 lb/ft^3" }' in after.text
    after = after.with_value("leg[1].length", "3 ft 7 in")
    assert after.job().span.legs[1].length_m == pytest.approx(1.0922)
    assert changed_lines(FULL, after.text)[-1] == '+ length = "3 ft 7 in"'


def test_a_new_key_goes_to_the_end_of_its_table(job: JobText) -> None:
    """In front of the blank line and the comment that belong to the next table."""
    after = job.with_value("leg[1].bend_radius", None).with_value("leg[1].bend_radius", "230 mm")
    assert changed_lines(FULL, after.text) == [
        '- bend_radius = "114 mm"',
        '+ bend_radius = "230 mm"',
    ]
    after = job.with_value("contents.density", "1040 kg/m^3")
    assert '[contents]\nname = "water"\ndensity = "1040 kg/m^3"\n\n[state.tapped]' in after.text


def test_a_new_table_goes_where_a_person_looks_for_it() -> None:
    """Contents behind the pipe, states behind contents, masses behind supports."""
    text = (
        JobText(SMALL)
        .with_new("mass", {"at": "2 m", "mass": "24 kg"})
        .with_value("state.running.temperature", "65 degC")
        .with_value("contents.name", "water")
        .with_value("pipe.insulation.thickness", "50 mm")
        .with_value("pipe.insulation.density", "130 kg/m^3")
        .with_value("title", "Riser")
    )
    headers = [line for line in text.text.splitlines() if line.startswith("[")]
    assert headers == [
        "[pipe]",
        "[contents]",
        "[state.running]",
        "[[leg]]",
        "[[support]]",
        "[[mass]]",
    ]
    assert 'insulation = { thickness = "50 mm", density = "130 kg/m^3" }\n' in text.text
    assert text.text.startswith('fieldkit = 1\ntitle = "Riser"\n[pipe]')
    assert text.job().span.masses[0].mass_kg == 24.0


def test_a_new_entry_stands_behind_the_last_one(job: JobText) -> None:
    """The comment above the next table stays with that table."""
    after = job.with_new("leg", {"direction": "+y", "length": "2 m", "bend_radius": ""})
    assert '"114 mm"\n[[leg]]\ndirection = "+y"\nlength = "2 m"\n\n# the supports\n' in after.text
    assert len(after.job().span.legs) == 3


def test_an_entry_is_taken_out_with_what_is_its_own(job: JobText) -> None:
    """Header and keys go; what is said about the others stays."""
    after = job.without("support", 1).without("excitation", 0)
    gone = changed_lines(FULL, after.text)
    assert all(line.startswith("-") for line in gone)
    assert "# the supports" in after.text
    assert len(after.job().span.supports) == 1
    assert after.job().excitations[0].name == "drive ripple"


def test_a_comment_right_above_an_entry_goes_with_it() -> None:
    """A remark about a support that is gone would be read as one about the next."""
    rest = '\n# by the stair, loose\n[[support]]\nat = "2 m"\nkind = "rest"\n'
    clamp = '\n# at the rack\n[[support]]\nat = "4 m"\nkind = "clamp"\n'
    after = JobText(SMALL + rest + clamp).without("support", 1)
    assert after.text == SMALL + clamp


def test_taking_out_the_last_key_takes_out_its_table(job: JobText) -> None:
    """No empty [contents] or insulation is left behind to be refused."""
    after = job.with_value("contents.name", "").with_value("state.running.fill", None)
    assert "[contents]" not in after.text
    assert after.job().contents_name == ""
    bare = job.with_value("pipe.insulation.thickness", "").with_value("pipe.insulation.density", "")
    assert changed_lines(FULL, bare.text) == [
        '- insulation = { thickness = "50 mm", density = "130 kg/m^3" }'
    ]


def test_entries_change_places_with_their_lines(job: JobText) -> None:
    """Moving an entry moves its text."""
    after = job.moved("excitation", 0, 1)
    assert [entry.name for entry in after.job().excitations] == ["drive ripple", "pump"]
    assert sorted(after.text.splitlines()) == sorted(FULL.splitlines())
    assert after.moved("excitation", 1, 0).text == FULL


OTHER_LAYOUT = """\
fieldkit = 1
pipe.size = "NPS 3"
pipe.schedule = "40"
pipe.material = "carbon steel" # dotted
leg = [ { direction = "+x", length = "4.2 m" }, # first
  { direction = "+z", length = "1.1 m" },
]
state = { tapped = { fill = 0 } }
support = [{ at = "0 m", kind = "anchor" }]
"""


def test_other_layouts_of_toml_are_edited_in_kind() -> None:
    """Dotted keys and inline arrays, which are TOML too, keep their form."""
    text = (
        JobText(OTHER_LAYOUT)
        .with_value("pipe.insulation.thickness", "50 mm")
        .with_value("pipe.insulation.density", "130 kg/m^3")
        .with_value("state.running.temperature", "65 degC")
        .with_value("leg[1].bend_radius", "114 mm")
        .with_new("leg", {"direction": "+y", "length": "2 m"})
        .with_new("support", {"at": "1 m", "kind": "rest"})
    )
    job = text.job()
    assert [leg.length_m for leg in job.span.legs] == [4.2, 1.1, 2.0]
    assert (job.span.legs[1].bend_radius_m, job.running.temperature_k) == (0.114, 338.15)
    assert len(job.span.supports) == 2
    assert job.span.insulation is not None
    assert "# first" in text.text
    assert "# dotted" in text.text
    less = text.without("leg", 1).without("support", 1).with_value("leg[0].length", "5 m")
    assert [leg.length_m for leg in less.job().span.legs] == [5.0, 2.0]


def test_text_is_taken_as_people_type_it(job: JobText) -> None:
    """Ranges with to, lists with commas, numbers where numbers belong."""
    typed = {
        "excitation[0].speed": ("1450 to 1500 rpm", ["1450 rpm", "1500 rpm"]),
        "excitation[0].orders": ("1, 2,3 6", [1, 2, 3, 6]),
        "excitation[1].frequency": ("99 Hz .. 101 Hz", ["99 Hz", "101 Hz"]),
        "state.tapped.fill": ("0 to 0.5", [0, 0.5]),
        "state.running.fill": ("90 %", "90 %"),
        "mass[0].tolerance": ("0,2", 0.2),
        "mass[0].offset": ("0, 0, 0,18 m", ["0 m", "0 m", "0,18 m"]),
        "leg[1].direction": ("1, 0, 1", [1.0, 0.0, 1.0]),
        "goal.keep_out": ("1 to 2 m; 3 m to 4 m", [["1 m", "2 m"], ["3 m", "4 m"]]),
        "goal.steel": ("1 to 2 m; 3 m to 4 m", [["1 m", "2 m"], ["3 m", "4 m"]]),
        "goal.allow": ("mass, move", ["mass", "move"]),
        "title": ("12", "12"),
        "support[1].lateral": ("rigid", "rigid"),
    }
    for field, (text, value) in typed.items():
        job = job.with_value(field, text)
        assert job.value(field) == value, field
    assert job.job().goal.keep_out_m == ((1.0, 2.0), (3.0, 4.0))
    assert job.get("excitation[0].speed") == "1450 rpm to 1500 rpm"
    assert job.get("goal.keep_out") == "1 m to 2 m; 3 m to 4 m"


def test_what_is_shown_for_editing_reads_back(job: JobText) -> None:
    """The text of every field, typed again, gives the same values."""
    for table in ("", "pipe", "contents", "state.running", "leg", "support", "mass",
                  "excitation", "recording", "measured", "goal"):  # fmt: skip
        for i, row in enumerate(job.rows(table)):
            prefix = f"{table}[{i}]." if isinstance(job.value(table), list) else f"{table}."
            for key, text in row.items():
                field = (prefix + key).lstrip(".")
                assert job.get(field) == text
                assert job.with_value(field, text).value(field) == job.value(field), field


def test_rows_list_a_table_as_texts(job: JobText) -> None:
    """Numbers as they are written, nested keys dotted, nothing for what is not there."""
    assert job.rows("excitation")[0] == {
        "name": "pump",
        "speed": "1450 rpm to 1495 rpm",
        "orders": "1, 2, 6",
    }
    assert job.rows("pipe")[0]["insulation.thickness"] == "50 mm"
    assert JobText("mass = 1\n").rows("mass") == []
    assert JobText(SMALL).rows("goal") == []
    assert JobText("[[mass]]\nmass = 2.50e1\n").rows("mass") == [{"mass": "2.50e1"}]
    assert (job.get("goal.nothing"), job.value("leg[7].length")) == ("", None)


def test_edits_are_judged_as_a_whole(job: JobText) -> None:
    """Half an edit may stand; the job says what is wrong with it."""
    half = job.with_value("pipe.size", "").with_value("pipe.outside_diameter", "88.9 mm")
    with pytest.raises(InputError, match="a schedule belongs to a standard size"):
        half.job()
    whole = half.with_value("pipe.schedule", "").with_value("pipe.wall", "5.49 mm")
    assert whole.job().span.pipe.wall_m == 0.00549


def test_entries_that_do_not_exist_are_refused(job: JobText) -> None:
    """An index from a stale screen is an InputError, not a fault."""
    for edit in (
        lambda: job.with_value("support[9].at", "1 m"),
        lambda: job.without("mass", 3),
        lambda: job.moved("leg", 0, 5),
    ):
        with pytest.raises(InputError, match="there is no"):
            edit()
    with pytest.raises(InputError, match="not valid TOML"):
        JobText("a = \n").with_value("title", "x")
    with pytest.raises(InputError, match="cannot be written"):
        job.with_value("title", "\ud800")


def test_a_new_job_is_valid() -> None:
    """The document to start from is a whole job without excitation."""
    job = new_job_text().job()
    assert (len(job.span.legs), len(job.span.supports), job.excitations) == (1, 2, ())


def test_load_edit_save_keeps_every_other_byte(tmp_path: Path) -> None:
    """Byte order mark, carriage returns, tabs, a last line without an end."""
    raw = b"\xef\xbb\xbf" + FULL.replace("\n", "\r\n").rstrip().encode() + b"\t# end"
    path = tmp_path / "job.toml"
    path.write_bytes(raw)
    load_text(path).with_value("mass[0].mass", "25 kg").save()
    assert path.read_bytes() == raw.replace(b'"24 kg"', b'"25 kg"')
    load_text(path).with_new("recording", {"file": "b.flac", "kind": "tap"}).save()
    assert (
        b'at = "1.9 m"\r\n[[recording]]\r\nfile = "b.flac"\r\nkind = "tap"\r\n\r\n'
        in path.read_bytes()
    )
    load_text(path).with_value("goal.chance", "0.8").with_value("goal.up_to", None).save()
    assert load_job(path).goal.chance == 0.8


def test_saving_replaces_the_file_in_one_piece(tmp_path: Path) -> None:
    """Mode and link are kept, nothing else is left in the folder, a failure leaves the old file."""
    real = tmp_path / "real.toml"
    real.write_text(SMALL)
    real.chmod(0o640)
    link = tmp_path / "link.toml"
    link.symlink_to(real)
    saved = JobText(FULL).save(link)
    assert (saved.path, real.read_text(), link.is_symlink()) == (link, FULL, True)
    assert stat.S_IMODE(real.stat().st_mode) == 0o640
    assert sorted(os.listdir(tmp_path)) == ["link.toml", "real.toml"]
    with pytest.raises(InputError, match="cannot be written"):
        JobText("title = '\ud800'").save(real)
    assert real.read_text() == FULL
    assert sorted(os.listdir(tmp_path)) == ["link.toml", "real.toml"]


def test_saving_where_one_cannot_is_a_sentence(tmp_path: Path) -> None:
    """A missing folder, a folder in its place, no name at all."""
    for target in (tmp_path / "no" / "job.toml", tmp_path):
        with pytest.raises(InputError, match="it cannot be written") as caught:
            JobText(SMALL).save(target)
        assert caught.value.place.file == target
    with pytest.raises(InputError, match="no file yet"):
        JobText(SMALL).save()


def test_a_saved_job_reads_as_the_same_job(tmp_path: Path) -> None:
    """Save and load give the job that was on the screen."""
    path = tmp_path / "job.toml"
    saved = JobText(FULL).with_value("title", 'a "b" \\ \x1b [red]').save(path)
    assert load_job(path) == saved.job() == parse_job(saved.text, path)


titles = st.text(max_size=12)
fields = st.sampled_from(
    ["title", "contents.name", "state.tapped.fill", "state.running.pressure", "leg[0].length",
     "leg[1].bend_radius", "support[1].lateral", "mass[0].offset", "excitation[1].orders",
     "recording[0].scale", "goal.keep_out", "pipe.insulation.density", "pipe.wall", "units"]
)  # fmt: skip
values = st.one_of(
    titles, st.none(), st.integers(-9, 9), st.floats(-9, 9), st.lists(titles, max_size=3),
    st.sampled_from(["1 to 2 m", "1, 2", "[1]", "]", "#", '"""', "'''", "a = 1"]),
)  # fmt: skip
edits = st.lists(st.tuples(fields, values), min_size=1, max_size=4)


def data_after(table: dict[str, Any], field: str, value: object) -> dict[str, Any]:
    """The same edit made on a second document by a general TOML library."""
    document = tomlkit.parse(tomlkit.dumps(table))
    *path, key = [
        int(p) if p.isdigit() else p for p in field.replace("[", ".").replace("]", "").split(".")
    ]
    inner: Any = document
    for i, part in enumerate(path):
        if isinstance(part, str) and part not in inner:
            if value is None:
                return table
            inner[part] = {} if i + 1 == len(path) else tomlkit.table()
        inner = inner[part]
    if value is None:
        if key in inner:
            del inner[key]
    else:
        inner[key] = value
    return tomllib.loads(tomlkit.dumps(document))


def pruned(value: Any) -> Any:
    """Without tables that hold nothing."""
    if isinstance(value, dict):
        inner = {key: pruned(item) for key, item in value.items()}
        return {key: item for key, item in inner.items() if item != {}}
    return [pruned(item) for item in value] if isinstance(value, list) else value


@given(edits, st.sampled_from([FULL, FULL.replace("\n", "\r\n"), FULL.rstrip("\n")]))
@settings(max_examples=60, deadline=None)
def test_any_edit_does_what_a_toml_library_does(edit: list[tuple[str, object]], start: str) -> None:
    """After any edits the text is TOML, holds the values asked for, and every comment is there."""
    job = JobText(start)
    expected = tomllib.loads(start)
    for field, value in edit:
        blank = isinstance(value, str) and not value.strip()
        job = job.with_value(field, value)
        wanted = None if value is None or blank else job.value(field)
        if isinstance(value, str) and field in ("title", "leg[0].length", "units"):
            assert (wanted or "") == value.strip()
        expected = data_after(expected, field, wanted)
    assert pruned(tomllib.loads(job.text)) == pruned(expected)
    assert all(note in job.text for note in ("# format version", "# walked from", "# the supports"))
