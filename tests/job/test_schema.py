"""A job file becomes a Job."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
import tomlkit
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.errors import InputError
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.job.schema import load_job, parse_job, require_excitation
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Insulation, Leg, PointMass, State, Support
from fieldkit.span.supports import springs
from tests.job.sample import FULL, SMALL


@pytest.fixture(scope="module")
def full() -> Job:
    return parse_job(FULL, Path("plant/job.toml"))


def test_describes_the_span(full: Job) -> None:
    """Pipe, legs, supports, masses and what is in and around the pipe."""
    span = full.span
    assert (span.pipe.outside_diameter_m, span.pipe.wall_m) == (0.0889, 0.00549)
    assert span.material.name == "carbon steel"
    assert span.insulation == Insulation(0.05, 130.0)
    assert span.contents_density_kg_per_m3 == 998.0
    assert span.legs == (Leg((1, 0, 0), 4.2), Leg((0, 0, 1), 1.1, 0.114))
    assert span.supports[1] == Support(4.0, "clamp", "unknown", 2e6, 0.0, math.inf)
    assert span.masses == (PointMass(2.6, 24.0, "check valve", 0.15, (0.0, 0.0, 0.18)),)


def test_describes_states_and_what_shakes(full: Job) -> None:
    """States in SI, speeds in revolutions per second."""
    assert full.tapped == State("tapped", (0.0, 0.0), 293.15, 0.0)
    assert full.running == State("running", (1.0, 1.0), 338.15, 6e5)
    pump = Excitation("pump", (pytest.approx(1450 / 60), pytest.approx(1495 / 60)), (1, 2, 6))
    assert full.excitations == (pump, Excitation("drive ripple", None, (1.0,), (100.0, 100.0)))


def test_describes_what_was_measured_and_wanted(full: Job) -> None:
    """Recordings beside the job file with their calibration, typed peaks, the goal."""
    entry = full.recordings[0]
    assert entry == RecordingEntry(
        Path("plant/tap-1.flac"),
        "tap",
        "tapped",
        scale=pytest.approx(1.4 / (0.1 / 9.80665)),
        direction="vertical",
        at_m=1.9,
    )
    assert full.measured == (MeasuredMode(23.4, 0.1, 0.011, None, "vertical", source="typed"),)
    assert full.goal == Goal(
        allow=("support", "mass"), keep_out_m=((1.0, 1.6),), steel_m=((2.0, 3.0),)
    )
    assert (full.title, full.units, full.contents_name) == (
        "Glycol booster, discharge line", "SI", "water",
    )  # fmt: skip


def test_fills_in_what_is_left_out() -> None:
    """A job of a pipe, a leg and a support is whole: full as ever, empty without contents."""
    job = parse_job(SMALL)
    assert job.tapped == State("tapped")
    assert job.running == State("running")
    assert job.span.contents_density_kg_per_m3 == 0.0
    assert (job.goal, job.excitations, job.recordings, job.units) == (Goal(), (), (), "SI")
    assert job.span.supports == (Support(0.0, "anchor"),)


def edited(old: str, new: str, text: str = FULL) -> Job:
    assert old in text
    return parse_job(text.replace(old, new), Path("plant/job.toml"))


def test_running_is_as_tapped_where_left_out() -> None:
    """Running state: each key left out is taken from the tapped one."""
    job = edited('[state.running]\nfill = 1.0\ntemperature = "65 degC"\n', "[state.running]\n")
    assert job.running == State("running", (0.0, 0.0), 293.15, 6e5)


def test_fill_may_be_a_range_or_percent() -> None:
    """Nobody knows: a range; as a share or in percent."""
    assert edited("fill = 0.0", "fill = [0.0, 1.0]").tapped.fill == (0.0, 1.0)
    assert edited("fill = 0.0", 'fill = "40 %"').tapped.fill == (0.4, 0.4)


@pytest.mark.parametrize(
    ("pipe", "radius_m"),
    [
        ('size = "NPS 3"\nschedule = "40"', 1.5 * 3 * 0.0254),
        ("size = 3\nschedule = 40", 1.5 * 3 * 0.0254),
        ('size = "DN 80"\nschedule = "40"', 1.5 * 3 * 0.0254),
        ('size = "1-1/2"\nschedule = "80"', 1.5 * 1.5 * 0.0254),
        ('size = "NPS 3/4"\nschedule = "80"', 1.5 * 0.75 * 0.0254),
        ('size = "NPS 3"\nwall = "4.9 mm"', 1.5 * 3 * 0.0254),
        ('outside_diameter = "88.9 mm"\nwall = "5.49 mm"', 1.5 * 0.0889),
    ],
)
def test_a_bend_is_long_radius_where_left_out(pipe: str, radius_m: float) -> None:
    """1.5 times the nominal size, or the measured diameter (ASME B16.9 long-radius elbow)."""
    text = FULL.replace('size = "NPS 3"\nschedule = "40"', pipe)
    job = edited('bend_radius = "114 mm"\n', "", text)
    assert job.span.legs[1].bend_radius_m == pytest.approx(radius_m)


def test_a_size_may_come_with_a_measured_wall() -> None:
    """Corroded pipe: standard outside diameter, measured wall."""
    pipe = edited('schedule = "40"', 'wall = "4.9 mm"').span.pipe
    assert (pipe.outside_diameter_m, pipe.wall_m) == (0.0889, pytest.approx(0.0049))


def test_a_material_may_be_given_by_its_numbers() -> None:
    """Modulus, density, Poisson's ratio and, if known, expansion."""
    table = (
        '{ elastic_modulus = "70 GPa", density = 2700, poisson = 0.33, expansion = "23e-6 1/K" }'
    )
    steel = edited('"carbon steel"', table).span.material
    assert steel.modulus_at(400.0) == 70e9
    assert (steel.density_kg_per_m3, steel.poisson) == (2700.0, 0.33)
    assert steel.expansion_per_k == pytest.approx(23e-6)
    header = (
        '[pipe.material]\nelastic_modulus = "70 GPa"\ndensity = 2700\npoisson = 0.33\n[contents]'
    )
    text = FULL.replace('material = "carbon steel"\n', "")
    assert edited("[contents]", header, text).span.material.modulus_at(300.0) == 70e9


def test_directions_are_normalised() -> None:
    """A vector of any length, or a signed axis."""
    assert edited('"+z"', "[3, 0, 4.0]").span.legs[1].direction == pytest.approx((0.6, 0, 0.8))
    assert edited('"+z"', '"-Y"').span.legs[1].direction == (0, -1, 0)


@pytest.mark.parametrize(
    ("lines", "quantity", "scale"),
    [
        ('scale = "9.81 m/s^2 per unit"', "acceleration", 9.81),
        ('scale = "1 g/unit"', "acceleration", 9.80665),
        ("scale = 2.5", "pressure", 2.5),
        ('scale = "25 um per unit"', "displacement", 25e-6),
        ('sensitivity = "4 V/(in/s)"\nfull_scale = "2 V"', "velocity", 0.5 * 0.0254),
        ('sensitivity = "50 mV/Pa"\nfull_scale = "1 V"', "pressure", 20.0),
        ('sensitivity = "50 mV/Pa"', "pressure", None),
        ("", "acceleration", None),
    ],
)
def test_calibration_of_a_recording(lines: str, quantity: str, scale: float | None) -> None:
    """SI per unit of sample, from a scale or from sensitivity and full scale."""
    text = FULL.replace('quantity = "acceleration"', f'quantity = "{quantity}"')
    job = edited('sensitivity = "100 mV/g"\nfull_scale = "1.4 V"', lines, text)
    assert job.recordings[0].scale == (None if scale is None else pytest.approx(scale))


def test_a_text_recording_in_volts_needs_no_full_scale() -> None:
    """A column of volts is calibrated by the sensitivity alone."""
    text = FULL.replace('full_scale = "1.4 V"\n', "")
    assert edited("tap-1.flac", "tap-1.csv", text).recordings[0].scale == pytest.approx(98.0665)


def test_a_recording_is_of_the_state_its_kind_implies() -> None:
    """A tap is taken as tapped, a running recording as running."""
    text = FULL.replace('state = "tapped"\nchannel', "channel")
    assert edited('"tap"', '"tap"', text).recordings[0].state == "tapped"
    assert edited('"tap"', '"running"', text).recordings[0].state == "running"


def support_of(lines: str, leg: str) -> Job:
    return parse_job(SMALL.replace('"+x"', leg).replace('kind = "anchor"', lines))


def stiffness_by_axis(job: Job) -> dict[str, float]:
    return {spring.axis: spring.stiffness for spring in springs(job.span)}


def test_z_replaces_vertical_on_a_level_leg() -> None:
    """x, y, z stand in place of the named directions: nothing is held twice."""
    held = stiffness_by_axis(support_of('kind = "clamp"\nz = "3 MN/m"', '"+x"'))
    assert held["z"] == 3e6
    assert "vertical" not in held
    assert held.keys() >= {"lateral", "axial"}


def test_vertical_and_axial_are_one_on_a_riser() -> None:
    """On a riser a clamp's vertical stiffness takes the place of its axial one."""
    held = stiffness_by_axis(support_of('kind = "clamp"\nvertical = "3 MN/m"', '"+z"'))
    assert held["axial"] == 3e6
    assert "vertical" not in held


def test_all_three_axes_serve_on_a_sloping_leg() -> None:
    """Where no axis is along x, y or z, all three together replace the named ones."""
    held = stiffness_by_axis(
        support_of('kind = "guide"\nx = "1 MN/m"\ny = "2 MN/m"\nz = "3 MN/m"', "[1, 1, 1]")
    )
    assert held == {"x": 1e6, "y": 2e6, "z": 3e6}


def test_two_supports_may_stand_at_one_place() -> None:
    """A rest and a guide at the same station are ordinary."""
    text = SMALL + '[[support]]\nat = "0 m"\nkind = "anchor"\n'
    assert len(parse_job(text).span.supports) == 2


def test_only_some_work_needs_an_excitation(tmp_path: Path) -> None:
    """A job without excitation is a job; asking for a cure of it is refused with a sentence."""
    path = tmp_path / "job.toml"
    path.write_text(SMALL)
    job = load_job(path)
    with pytest.raises(InputError, match="the job names no excitation") as caught:
        require_excitation(job)
    assert caught.value.place.field == "excitation"
    require_excitation(parse_job(FULL))


def test_hostile_names_pass_as_data() -> None:
    """Titles and names are the user's: markup and control characters are kept as they are."""
    hostile = "[bold]x[/bold] \\u001b[31m \\u202e {{ 7*7 }} <script>"
    job = edited("Glycol booster, discharge line", hostile)
    assert job.title == "[bold]x[/bold] \x1b[31m \u202e {{ 7*7 }} <script>"


def test_a_mark_at_the_start_and_windows_line_ends_do_no_harm(tmp_path: Path) -> None:
    """Editors on Windows add a byte order mark and carriage returns."""
    path = tmp_path / "job.toml"
    path.write_bytes(b"\xef\xbb\xbf" + FULL.replace("\n", "\r\n").encode())
    assert load_job(path).span == parse_job(FULL).span


metres = st.floats(0.5, 20.0).map(lambda value: round(value, 3))


@st.composite
def jobs(draw: st.DrawFn) -> dict[str, object]:
    """A job that must be accepted."""
    legs = draw(st.lists(metres, min_size=1, max_size=4))
    end = sum(legs)
    station = st.floats(0, 1).map(lambda share: f"{share * end:.3f} m")
    stiff = st.sampled_from(["rigid", "free", "unknown", "2 MN/m", "11 kip/in", 3e6])
    support = st.fixed_dictionaries(
        {"at": station, "kind": st.sampled_from(["anchor", "clamp", "guide", "rest", "free"])},
        optional={"lateral": stiff, "rotation": st.sampled_from(["rigid", "250 kN m/rad"])},
    )
    mass = st.fixed_dictionaries(
        {"at": station, "mass": st.floats(0, 500).map(lambda kg: f"{kg:.2f} kg")},
        optional={"name": st.text(max_size=10), "tolerance": st.floats(0, 1)},
    )
    speed = st.floats(100, 3000).map(lambda rpm: f"{rpm:.1f} rpm")
    return {
        "fieldkit": 1,
        "title": draw(st.text(max_size=20)),
        "pipe": {"size": draw(st.sampled_from(["NPS 2", "DN 100", "6"])), "schedule": "40",
                 "material": draw(st.sampled_from(["carbon steel", "316"]))},
        "leg": [{"direction": "+x" if i % 2 else "+z", "length": f"{length} m"}
                for i, length in enumerate(legs)],
        "support": draw(st.lists(support, min_size=1, max_size=4)),
        "mass": draw(st.lists(mass, max_size=3)),
        "excitation": [{"speed": draw(speed), "orders": [1, 2.5]}],
    }  # fmt: skip


@given(jobs())
@settings(max_examples=30, deadline=None)
def test_any_valid_job_is_read(table: dict[str, object]) -> None:
    """What fits the format is accepted, and says the same when written in another layout."""
    text = tomlkit.dumps(table)
    job = parse_job(text)
    assert job.title == table["title"]
    assert len(job.span.supports) == len(table["support"])
    assert parse_job("# note\n" + text.replace(" = ", "  =  ")).span.legs == job.span.legs
