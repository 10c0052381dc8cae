"""Quantities as people write them, in and out."""

from __future__ import annotations

import math
import subprocess
import sys

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.quantity import DIMENSIONS, parse, show

AS_WRITTEN = [
    (6.1, "length", 6.1),
    (4, "length", 4.0),
    ("6.1", "length", 6.1),
    ("6,1 m", "length", 6.1),
    ("6.1 m", "length", 6.1),
    ("88.9mm", "length", 0.0889),
    ("0,125 in", "length", 0.003175),
    ("20 ft", "length", 6.096),
    ("20' 3\"", "length", 6.1722),
    ("20'-3\"", "length", 6.1722),
    ("20′ 3″", "length", 6.1722),
    ("13 ft 9 in", "length", 4.191),
    ("13ft9in", "length", 4.191),
    ("4 ft 3 1/2 in", "length", 1.3081),
    ("4' 3-1/2\"", "length", 1.3081),
    ("3/4 in", "length", 0.01905),
    ("3½ in", "length", 0.0889),
    ('3-1/2"', "length", 0.0889),
    ("-0.18 m", "offset", -0.18),
    ("−50 mm", "offset", -0.05),
    ("2e6 N/m", "stiffness", 2e6),
    ("2×10^6 N/m", "stiffness", 2e6),
    ("2 MN/m", "stiffness", 2e6),
    ("2 kN/mm", "stiffness", 2e6),
    ("200 kg/mm", "stiffness", 1961330.0),
    ("5 Nm/rad", "rotational_stiffness", 5.0),
    ("5 N m/rad", "rotational_stiffness", 5.0),
    ("5 N·m/rad", "rotational_stiffness", 5.0),
    ("5 kN-m/rad", "rotational_stiffness", 5000.0),
    ("1 Nm/deg", "rotational_stiffness", 180 / math.pi),
    ("1480 rpm", "speed", 1480 / 60),
    ("1480 RPM", "speed", 1480 / 60),
    ("1480 1/min", "speed", 1480 / 60),
    ("1480 r/min", "speed", 1480 / 60),
    ("1480 rev/min", "speed", 1480 / 60),
    ("25 Hz", "speed", 25.0),
    ("100 rad/s", "speed", 100 / (2 * math.pi)),
    ("1480 rpm", "frequency", 1480 / 60),
    ("100 rad/s", "frequency", 100 / (2 * math.pi)),
    ("2 kHz", "frequency", 2000.0),
    (23.4, "frequency", 23.4),
    ("24 kg", "mass", 24.0),
    ("500 g", "mass", 0.5),
    ("1.2 t", "mass", 1200.0),
    ("130 kg/m^3", "density", 130.0),
    ("130 kg/m3", "density", 130.0),
    ("130 kg/m³", "density", 130.0),
    ("0.998 g/cm3", "density", 998.0),
    ("65 degC", "temperature", 338.15),
    ("65 °C", "temperature", 338.15),
    ("65C", "temperature", 338.15),
    ("-10 degC", "temperature", 263.15),
    ("149 degF", "temperature", 338.15),
    ("149 F", "temperature", 338.15),
    ("338.15 K", "temperature", 338.15),
    (293.15, "temperature", 293.15),
    ("6 bar", "pressure", 6e5),
    ("6 barg", "pressure", 6e5),
    ("6 bar(g)", "pressure", 6e5),
    ("600 kPa", "pressure", 6e5),
    ("0.6 MPa", "pressure", 6e5),
    ("-0.5 bar", "pressure", -5e4),
    (0, "pressure", 0.0),
    ("200 GPa", "modulus", 2e11),
    ("200000 N/mm2", "modulus", 2e11),
    ("1 g", "acceleration", 9.80665),
    ("9.81 m/s^2", "acceleration", 9.81),
    ("18 mm/s", "velocity", 0.018),
    ("1 in/s", "velocity", 0.0254),
    ("1 ips", "velocity", 0.0254),
    ("200 mV", "voltage", 0.2),
    ("100 mV/g", "sensitivity", 0.1 / 9.80665),
    ("10.2 mV/(m/s^2)", "sensitivity", 0.0102),
    ("4 V/(in/s)", "sensitivity", 4 / 0.0254),
    ("100 mV/in/s", "sensitivity", 0.1 / 0.0254),
    ("50 mV/Pa", "sensitivity", 0.05),
    ("2.3 mV/N", "force_sensitivity", 0.0023),
    ("10 mV/lb", "force_sensitivity", 0.01 / (0.45359237 * 9.80665)),
    ("100 lb", "force", 45.359237 * 9.80665),
    ("50 mV/Pa", "pressure_sensitivity", 0.05),
    ("8 mV/µm", "displacement_sensitivity", 8000.0),
    ("12e-6 1/K", "expansion", 12e-6),
    ("12 µm/(m K)", "expansion", 12e-6),
    ("6.5e-6 in/in/degF", "expansion", 11.7e-6),
    ("15 %", "ratio", 0.15),
    ("0.15", "ratio", 0.15),
]


@pytest.mark.parametrize(("written", "dimension", "si"), AS_WRITTEN)
def test_reads_what_people_write(written: object, dimension: str, si: float) -> None:
    """Every spelling reads as its value in SI."""
    assert parse(written, dimension) == pytest.approx(si, rel=1e-12)


# NIST Special Publication 811 (2008), Appendix B.8 (from memory)
SP811 = [
    ("1 lbf/in", "stiffness", 175.1268),
    ("1 lb/in", "stiffness", 175.1268),
    ("1 kip/in", "stiffness", 175126.8),
    ("1 k/in", "stiffness", 175126.8),
    ("1 lbf in/rad", "rotational_stiffness", 0.1129848),
    ("1 ft-lb/rad", "rotational_stiffness", 1.355818),
    ("1 lb", "mass", 0.4535924),
    ("1 lb/ft^3", "density", 16.01846),
    ("1 psi", "pressure", 6894.757),
    ("1 psig", "pressure", 6894.757),
    ("1 kg/cm2", "pressure", 98066.5),
    ("1 ksi", "modulus", 6894757.0),
    ("212 degF", "temperature", 373.15),
]


@pytest.mark.parametrize(("written", "dimension", "si"), SP811)
def test_factors_agree_with_published_ones(written: str, dimension: str, si: float) -> None:
    """Conversion factors agree with the published table to its seven digits."""
    assert parse(written, dimension) == pytest.approx(si, rel=1e-6)


GENERAL = [
    ("11 kip/in", "stiffness", "kip/inch", "N/m"),
    ("8 lb/ft^3", "density", "pound/foot**3", "kg/m**3"),
    ("87 psi", "pressure", "psi", "Pa"),
    ("29000 ksi", "modulus", "ksi", "Pa"),
    ("5 lbf in/rad", "rotational_stiffness", "lbf*inch", "N*m"),
    ("3 mil", "length", "mil_length", "m"),
    ("7 oz", "mass", "ounce", "kg"),
    ("4 kgf/mm", "stiffness", "kilogram_force/mm", "N/m"),
    ("2.5 g", "acceleration", "standard_gravity", "m/s**2"),
]


def test_factors_agree_with_a_general_library() -> None:
    """The small registry agrees with the one that a general unit library ships."""
    from pint import UnitRegistry

    shipped = UnitRegistry()
    shipped.define("mil_length = 0.001 * inch")
    for written, dimension, unit, si in GENERAL:
        number = float(written.split()[0])
        expected = shipped.Quantity(number, unit).to(si).magnitude
        assert parse(written, dimension) == pytest.approx(expected, rel=1e-12), written


REFUSED = [
    ("2.000.000", "stiffness", "2.000.000 may be read in two ways; write 2000000"),
    ("1,480 rpm", "speed", "1,480 may be read in two ways; write 1480 or 1.480"),
    ("1,234.5 kg", "mass", "1,234 may be read in two ways"),
    ("2 000 000 N/m", "stiffness", "may be read in two ways; write 2000000"),
    ("1480", "speed", "a bare 1480 leaves its unit open; write '1480 rpm' or '1480 Hz'"),
    (1480, "speed", "a bare 1480 leaves its unit open; write '1480 rpm' or '1480 Hz'"),
    (65, "temperature", "a bare 65 leaves its unit open; write '65 degC' or '65 K'"),
    ("65", "temperature", "a bare 65 leaves its unit open; write '65 degC' or '65 K'"),
    (-300, "temperature", "below absolute zero"),
    (-3, "temperature", "write '-3 degC' or '-3 K'"),
    ("-300 degC", "temperature", "below absolute zero"),
    (6, "pressure", "a bare 6 leaves its unit open; write '6 bar' or '6 Pa'"),
    ("-2 bar", "pressure", "below a full vacuum"),
    ("6 bara", "pressure", "this is an absolute pressure; write it as gauge"),
    (2, "stiffness", "a bare 2 leaves its unit open; write '2 MN/m' or '2 N/m'"),
    (100, "sensitivity", "write '100 mV/g'"),
    ("6 kg", "length", "'kg' is the unit of a mass, not of a length; write '4.2 m'"),
    ("50 mV/Pa", "acceleration_sensitivity", "the unit of a sensitivity to sound pressure"),
    ("5 kN m", "rotational_stiffness", "is not a unit of a rotational stiffness"),
    ("6 furlong", "length", "the unit 'furlong' is not known; write '4.2 m'"),
    ("2 mn/m", "stiffness", "did you mean 'mN' or 'MN'?"),
    ("6 M", "length", "did you mean 'm'?"),
    ("2 tons", "mass", "a ton may be short, long or metric"),
    ("nan", "mass", "write '24 kg' or '50 lb'"),
    ("inf kg", "mass", "write '24 kg' or '50 lb'"),
    ("1e999 kg", "mass", "is not a finite number"),
    (math.nan, "mass", "is not a finite number"),
    (math.inf, "stiffness", "is not a finite number"),
    (10**400, "mass", "is not a finite number"),
    ("-3 kg", "mass", "a mass cannot be negative"),
    (-3, "length", "a length cannot be negative"),
    ("0 mV/g", "sensitivity", "a sensitivity must be above zero"),
    ("1e9 m", "length", "too large to be a length"),
    ("200 Pa", "modulus", "too small for a pipe"),
    ("", "length", "a length is missing; write '4.2 m'"),
    ("m", "length", "does not start with a number"),
    ("1/2", "length", "a fraction needs its unit"),
    ("1/0 in", "length", "its fraction cannot be read"),
    ("20 ft 14 in", "length", "inches after the feet must be below 12"),
    ("20' 3", "length", "write '4.2 m', '88.9 mm' or '13 ft 9 in'"),
    ("1.5.2 m", "length", "its number cannot be read"),
    ("5 m//s", "velocity", "the unit 'm//s' cannot be read"),
    ("5 (m", "length", "the unit '(m' cannot be read"),
    ("5 m)", "length", "the unit 'm)' cannot be read"),
    ("5 m^2^3", "length", "the unit 'm^2^3' cannot be read"),
    ("5 m99", "length", "the unit 'm99' cannot be read"),
    ("0 degC^2", "acceleration", "is not a unit of an acceleration"),
    ("5 m" * 60, "length", "is too long"),
    (True, "length", "true is not a length"),
    (["4 m"], "length", "a list is not a length"),
    ({}, "length", "a table is not a length"),
    (None, "length", "is not a length"),
]


@pytest.mark.parametrize(("written", "dimension", "sentence"), REFUSED)
def test_refuses_with_a_sentence(written: object, dimension: str, sentence: str) -> None:
    """What cannot be a quantity is refused with what to write instead."""
    with pytest.raises(InputError) as caught:
        parse(written, dimension)
    assert sentence in str(caught.value)
    assert "write" in str(caught.value)


@pytest.mark.parametrize("hostile", ["5 m\x1b[31m", "[red]5 m", "5 \u202em", "5 m\n\n", "5\x00 m"])
def test_messages_hold_no_control_characters(hostile: str) -> None:
    """Whatever was typed, the message can be printed as it is."""
    with pytest.raises(InputError) as caught:
        parse(hostile, "mass")
    assert str(caught.value).isprintable()


def read_or_refused(text: str, dimension: str) -> bool:
    try:
        return math.isfinite(parse(text, dimension))
    except InputError as error:
        return str(error).isprintable()


@given(st.text(max_size=20), st.sampled_from(sorted(DIMENSIONS)))
@settings(max_examples=100, deadline=None)
def test_any_text_is_read_or_refused(text: str, dimension: str) -> None:
    """No text does anything else than give a finite number or an InputError."""
    assert read_or_refused(text, dimension)


@given(
    number=st.text("0123456789.,'\"/-e x*^", min_size=1, max_size=8),
    unit=st.text("mMkgftinlbs/N()^23*- .\"'%C", max_size=8),
    dimension=st.sampled_from(sorted(DIMENSIONS)),
)
@settings(max_examples=100, deadline=None)
def test_near_misses_are_read_or_refused(number: str, unit: str, dimension: str) -> None:
    """Text that looks like a quantity never ends in anything but a number or an InputError."""
    assert read_or_refused(number + unit, dimension)


RANGES = {
    "length": (1e-5, 9e4),
    "offset": (-1e3, 1e3),
    "mass": (1e-3, 1e5),
    "frequency": (1e-2, 9e4),
    "speed": (1e-1, 3e3),
    "stiffness": (1.0, 1e13),
    "rotational_stiffness": (1.0, 1e12),
    "temperature": (60.0, 1500.0),
    "pressure": (-1e5, 1e8),
    "modulus": (1e6, 5e11),
    "density": (1e-1, 2e4),
    "acceleration": (-1e3, 1e3),
    "velocity": (-10.0, 10.0),
    "sound_pressure": (-200.0, 200.0),
    "voltage": (-20.0, 20.0),
    "sensitivity": (1e-4, 10.0),
    "acceleration_sensitivity": (1e-4, 10.0),
    "velocity_sensitivity": (1e-2, 1e4),
    "displacement_sensitivity": (1.0, 1e5),
    "pressure_sensitivity": (1e-4, 1.0),
    "force_sensitivity": (1e-5, 1.0),
    "expansion": (1e-6, 1e-4),
    "ratio": (-1.0, 2.0),
}
OFFSET_K = 273.15


@given(
    dimension=st.sampled_from(sorted(RANGES)),
    share=st.floats(0, 1),
    units=st.sampled_from(["SI", "US"]),
    digits=st.integers(3, 9),
)
@settings(max_examples=100, deadline=None)
def test_what_is_shown_reads_back(dimension: str, share: float, units: str, digits: int) -> None:
    """show then parse gives the value back within half a unit of the last digit shown."""
    low, high = RANGES[dimension]
    value = low * (high / low) ** share if low > 0 else low + share * (high - low)
    back = parse(show(value, dimension, units, digits), dimension)
    size = abs(value) + (OFFSET_K if dimension == "temperature" else 0.0)
    assert back == pytest.approx(value, abs=0.51 * 10.0 ** (1 - digits) * size, rel=1e-9)


def test_every_dimension_can_be_shown_in_both_systems() -> None:
    """No kind of quantity lacks display units."""
    for dimension in DIMENSIONS:
        for units in ("SI", "US"):
            assert "unknown" not in show(0.5, dimension, units)


SHOWN = [
    (4.2, "length", "4.2 m", "13 ft 9.4 in"),
    (4.0, "length", "4.0 m", "13 ft 1.5 in"),
    (0.0889, "length", "88.9 mm", "3.5 in"),
    (0.0, "length", "0 m", "0 ft"),
    (0.0, "frequency", "0 Hz", "0 Hz"),
    (0.0, "stiffness", "0 N/m", "0 lbf/in"),
    (0.0, "pressure", "0 bar", "0 psi"),
    (6.096, "length", "6.096 m", "20 ft"),
    (-6.2, "offset", "-6.2 m", "-20 ft 4.1 in"),
    (4e6, "stiffness", "4.0 MN/m", "22.8 kip/in"),
    (999999.0, "stiffness", "1.0 MN/m", "5.71 kip/in"),
    (24.0, "mass", "24 kg", "52.9 lb"),
    (24.7, "speed", "1482 rpm", "1482 rpm"),
    (23.41, "frequency", "23.41 Hz", "23.41 Hz"),
    (9.99996, "frequency", "10 Hz", "10 Hz"),
    (338.15, "temperature", "65 degC", "149 degF"),
    (6e5, "pressure", "6.0 bar", "87 psi"),
    (0.02, "pressure", "0.02 Pa", "0.02 Pa"),
    (2e11, "modulus", "200 GPa", "29010 ksi"),
    (998.0, "density", "998 kg/m^3", "62.3 lb/ft^3"),
    (0.0101972, "sensitivity", "100 mV/g", "100 mV/g"),
    (0.15, "ratio", "15 %", "15 %"),
    (12e-6, "expansion", "12 um/m/K", "6.67 uin/in/degF"),
    (math.inf, "stiffness", "rigid", "rigid"),
    (math.nan, "length", "unknown", "unknown"),
    (math.inf, "length", "unlimited", "unlimited"),
]


@pytest.mark.parametrize(("value", "dimension", "si", "us"), SHOWN)
def test_shows_as_people_expect(value: float, dimension: str, si: str, us: str) -> None:
    """Units and digits fit the size of the value; never a nan."""
    assert (show(value, dimension), show(value, dimension, "US")) == (si, us)


def test_the_unit_library_loads_on_first_use_only() -> None:
    """Importing the package does not load the unit library, which costs start-up time."""
    code = "import sys, fieldkit.quantity; sys.exit('pint' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
