"""Materials and contents by name, and the edges of their tables."""

import pytest

from fieldkit.errors import InputError
from fieldkit.span.materials import CONTENTS, MATERIALS, Material, contents_density, material


@pytest.mark.parametrize(
    ("spoken", "name"),
    [
        ("Carbon Steel", "carbon steel"),
        ("304", "stainless steel 304"),
        ("stainless steel 316L", "stainless steel 316"),
        ("SS 316", "stainless steel 316"),
        ("stainless steel", "stainless steel 304"),
        ("duplex", "duplex 2205"),
        ("copper", "copper"),
        ("aluminium", "aluminium 6061"),
        ("PVC", "PVC-U"),
        ("HDPE", "HDPE"),
        ("GRP", "GRP"),
    ],
)
def test_names_people_use(spoken, name):
    assert material(spoken).name == name


def test_an_unknown_material_lists_the_known_ones():
    with pytest.raises(InputError, match="'unobtainium'") as raised:
        material("unobtainium")
    assert all(name in raised.value.remedy for name in MATERIALS)


@pytest.mark.parametrize("name", MATERIALS)
def test_every_material_is_sane(name):
    """Softer as it warms, denser than water's foam, Poisson's ratio of a solid."""
    made_of = MATERIALS[name]
    moduli = [modulus for _, modulus in made_of.modulus_pa]
    kelvin = [temperature for temperature, _ in made_of.modulus_pa]
    assert moduli == sorted(moduli, reverse=True)
    assert kelvin == sorted(kelvin)
    assert made_of.modulus_at(293.15) > 0
    assert 900 < made_of.density_kg_per_m3 < 9000
    assert 0.25 < made_of.poisson < 0.5
    assert 1e-5 <= made_of.expansion_per_k < 2e-4


def test_modulus_goes_on_a_little_below_its_table():
    """0 degC lies under the 70 degF row: the first slope carries on."""
    steel = material("carbon steel")
    (t0, e0), (t1, e1) = steel.modulus_pa[:2]
    assert steel.modulus_at(273.15) == pytest.approx(e0 + (e1 - e0) / (t1 - t0) * (273.15 - t0))


@pytest.mark.parametrize(
    ("name", "kelvin"), [("carbon steel", 873.15), ("HDPE", 353.15), ("304", 77.0)]
)
def test_modulus_far_outside_its_table_is_refused(name, kelvin):
    with pytest.raises(InputError, match="is not known at") as raised:
        material(name).modulus_at(kelvin)
    assert "elastic_modulus" in raised.value.remedy


def test_one_row_holds_at_any_temperature():
    assert Material("own", 7850, 0.3, ((293.15, 2e11),), 0.0).modulus_at(900.0) == 2e11


def test_shear_modulus_of_an_isotropic_wall():
    own = Material("own", 7850, 0.25, ((293.15, 2e11),), 0.0)
    assert own.shear_modulus_at(293.15) == pytest.approx(2e11 / 2.5)


@pytest.mark.parametrize(
    ("spoken", "density"), [("water", 998), ("Seawater", 1025), ("glycol 50%", 1070), ("empty", 0)]
)
def test_contents_people_name(spoken, density):
    assert contents_density(spoken) == density


def test_unknown_contents_list_the_known_ones():
    with pytest.raises(InputError, match="'lemonade'") as raised:
        contents_density("lemonade")
    assert all(name in raised.value.remedy for name in CONTENTS)
