"""Channel set-ups and presets: the words of a job's recordings, checked alike."""

from __future__ import annotations

import pytest

from fieldkit.capture.presets import Preset, presets, presets_path, remove_preset, save_preset
from fieldkit.capture.setup import ChannelSetup, setup_from
from fieldkit.errors import InputError

SENSOR = ChannelSetup(
    "acceleration", sensitivity="100 mV/g", full_scale="1.4 V", direction="vertical", at="1.9 m"
)


def test_sensitivity_and_full_scale_give_the_scale():
    """100 mV/g and 1.4 V: full scale is 14 g, 137.293 m/s² (standard gravity 9.80665 m/s²)."""
    assert SENSOR.si_per_unit == pytest.approx(14 * 9.80665)
    assert SENSOR.at_m == 1.9
    assert ChannelSetup(sensitivity="100 mV/g").si_per_unit is None
    assert ChannelSetup(scale="9.81 m/s^2 per unit").si_per_unit == pytest.approx(9.81)


@pytest.mark.parametrize(
    ("values", "key", "says"),
    [
        ({"quantity": "accelleration"}, "quantity", "did you mean 'acceleration'"),
        ({"direction": "up"}, "direction", "'up' is not a direction"),
        ({"sensitivity": "100 mV"}, "sensitivity", "100 mV"),
        ({"sensitivity": "0 mV/g"}, "sensitivity", "above zero"),
        ({"full_scale": "1 V"}, "full_scale", "without sensitivity"),
        ({"sensitivity": "100 mV/g", "scale": "1 m/s^2"}, "scale", "both"),
        ({"at": "3 kg"}, "at", "3 kg"),
        ({"quantity": "velocity", "sensitivity": "100 mV/g"}, "sensitivity", "100 mV/g"),
    ],
)
def test_what_is_wrong_is_told_with_its_key(values, key, says):
    with pytest.raises(InputError) as caught:
        ChannelSetup(**values)
    assert caught.value.place.field == key
    assert says in str(caught.value)


def test_a_set_up_survives_its_table():
    assert setup_from(SENSOR.as_table()) == SENSOR
    assert ChannelSetup().as_table() == {"quantity": "acceleration"}
    with pytest.raises(InputError, match="not known"):
        setup_from({"colour": "red"})


def test_presets_are_kept_by_name(tmp_path):
    path = tmp_path / "deep" / "presets.toml"
    assert presets(path) == {}
    mine = Preset((SENSOR, ChannelSetup("pressure")), "USB input", 48000)
    save_preset(" two channels ", mine, path)
    save_preset('odd "name" [1]', Preset((ChannelSetup(),)), path)
    assert presets(path) == {"two channels": mine, 'odd "name" [1]': Preset((ChannelSetup(),))}
    remove_preset("two channels", path)
    assert list(presets(path)) == ['odd "name" [1]']
    with pytest.raises(InputError, match="no preset 'two channels'"):
        remove_preset("two channels", path)
    assert [p.name for p in path.parent.iterdir()] == ["presets.toml"]


@pytest.mark.parametrize("name", ["", "  ", "a\nb", "x" * 61])
def test_a_preset_needs_a_name_that_fits_a_line(tmp_path, name):
    with pytest.raises(InputError, match="cannot name"):
        save_preset(name, Preset((SENSOR,)), tmp_path / "presets.toml")


@pytest.mark.parametrize("text", ["[", "preset = 3", "[preset.a]\n", "[preset.a]\nchannel = [3]"])
def test_damaged_presets_are_told_and_kept(tmp_path, text):
    path = tmp_path / "presets.toml"
    path.write_text(text)
    with pytest.raises(InputError, match=r"presets\.toml"):
        save_preset("a", Preset((SENSOR,)), path)
    assert path.read_text() == text


def test_presets_lie_where_the_user_keeps_settings(monkeypatch, tmp_path):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    assert presets_path().name == "presets.toml"
    assert presets_path().parent.name == "fieldkit"
