"""Pipe materials and contents: modulus against temperature, density, expansion.

Moduli of the steels: ASME B31.1-1995, table of modulus against temperature, as printed in an open
engineering table (values in 10^6 psi, converted with 1 psi = 6894.757 Pa). Everything marked below
as from memory is a usual handbook figure that no document was held against.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldkit.errors import InputError, Place

COLDER_K = 60.0
"""How far below its table a modulus is carried on along the first slope."""
HOTTER_K = 10.0
"""How far above its table; creep and softening begin there, so hardly at all."""
_ZERO_CELSIUS_K = 273.15


@dataclass(frozen=True)
class Material:
    """What the pipe is made of."""

    name: str
    density_kg_per_m3: float
    poisson: float
    modulus_pa: tuple[tuple[float, float], ...]
    """(temperature_k, modulus_pa) rows in rising order; one row holds at any temperature."""
    expansion_per_k: float

    def modulus_at(self, temperature_k: float) -> float:
        """Elastic modulus in Pa, linear between rows; InputError outside the table."""
        kelvin, modulus = (np.array(column) for column in zip(*self.modulus_pa, strict=True))
        if len(kelvin) == 1:
            return float(modulus[0])
        if not kelvin[0] - COLDER_K <= temperature_k <= kelvin[-1] + HOTTER_K:
            raise _outside(self.name, temperature_k, float(kelvin[0]), float(kelvin[-1]))
        i = int(np.clip(np.searchsorted(kelvin, temperature_k) - 1, 0, len(kelvin) - 2))
        slope = (modulus[i + 1] - modulus[i]) / (kelvin[i + 1] - kelvin[i])
        return float(modulus[i] + slope * (temperature_k - kelvin[i]))

    def shear_modulus_at(self, temperature_k: float) -> float:
        """Shear modulus in Pa of an isotropic wall."""
        return self.modulus_at(temperature_k) / (2 * (1 + self.poisson))


def _outside(name: str, temperature_k: float, coldest_k: float, hottest_k: float) -> InputError:
    low, high = coldest_k - COLDER_K - _ZERO_CELSIUS_K, hottest_k + HOTTER_K - _ZERO_CELSIUS_K
    return InputError(
        f"the modulus of {name} is not known at {temperature_k - _ZERO_CELSIUS_K:.0f} degC",
        f"stay between {low:.0f} and {high:.0f} degC, or give elastic_modulus yourself",
        Place(field="state.temperature"),
    )


_FAHRENHEIT = (70, 200, 300, 400, 500, 600, 700, 800, 900, 1000)
_PSI_PA = 6894.757293168


def _b31(*million_psi: float) -> tuple[tuple[float, float], ...]:
    """A row of the ASME B31.1-1995 table in kelvin and pascal."""
    kelvin = [(f - 32) / 1.8 + _ZERO_CELSIUS_K for f in _FAHRENHEIT]
    return tuple((k, e * 1e6 * _PSI_PA) for k, e in zip(kelvin, million_psi, strict=True))


def _steady(low_c: float, high_c: float, modulus_pa: float) -> tuple[tuple[float, float], ...]:
    """One modulus held over the range in which it is within about 3 %."""
    return (low_c + _ZERO_CELSIUS_K, modulus_pa), (high_c + _ZERO_CELSIUS_K, modulus_pa)


_CARBON = _b31(29.5, 28.8, 28.3, 27.7, 27.3, 26.7, 25.5, 24.2, 22.4, 20.4)
_AUSTENITIC = _b31(28.3, 27.6, 27.0, 26.5, 25.8, 25.3, 24.8, 24.1, 23.5, 22.8)
_CR_MO_LOW = _b31(29.7, 29.0, 28.5, 27.9, 27.5, 26.9, 26.3, 25.5, 24.8, 23.9)
_CR_MO_HIGH = _b31(30.6, 29.8, 29.4, 28.8, 28.3, 27.7, 27.1, 26.3, 25.6, 24.6)
_PVC = ((293.15, 2.9e9), (338.15, 1.45e9))

MATERIALS: dict[str, Material] = {
    material.name: material
    for material in (
        # Density, Poisson's ratio and mean expansion from 20 to about 100 degC: from memory.
        Material("carbon steel", 7850, 0.3, _CARBON, 11.7e-6),
        Material("stainless steel 304", 7930, 0.3, _AUSTENITIC, 16.5e-6),
        Material("stainless steel 316", 7980, 0.3, _AUSTENITIC, 16.2e-6),
        Material("1.25Cr-0.5Mo steel", 7850, 0.3, _CR_MO_LOW, 11.8e-6),
        Material("2.25Cr-1Mo steel", 7850, 0.3, _CR_MO_HIGH, 11.8e-6),
        # From memory, moduli included.
        Material("duplex 2205", 7800, 0.3, _steady(-20, 80, 200e9), 13.0e-6),
        Material("copper", 8940, 0.34, _steady(-20, 80, 117e9), 16.8e-6),
        Material("aluminium 6061", 2700, 0.33, _steady(-20, 80, 69e9), 23.4e-6),
        Material("PVC-U", 1400, 0.38, _PVC, 70e-6),
        Material("HDPE", 950, 0.42, _steady(10, 30, 0.95e9), 180e-6),
        # Axial modulus of filament-wound pipe, a maker's open data sheet (13 GPa; epoxy 15 GPa);
        # the rest from memory. Filament-wound pipe is not isotropic: its shear is approximate.
        Material("GRP", 1800, 0.3, _steady(0, 60, 13e9), 20e-6),
    )
}

_ALIASES = {
    "steel": "carbon steel",
    "cs": "carbon steel",
    "mild steel": "carbon steel",
    "stainless": "stainless steel 304",
    "stainless steel": "stainless steel 304",
    "304": "stainless steel 304",
    "304l": "stainless steel 304",
    "321": "stainless steel 304",
    "347": "stainless steel 304",
    "310": "stainless steel 304",
    "316": "stainless steel 316",
    "316l": "stainless steel 316",
    "duplex": "duplex 2205",
    "2205": "duplex 2205",
    "aluminium": "aluminium 6061",
    "aluminum": "aluminium 6061",
    "6061": "aluminium 6061",
    "pvc": "PVC-U",
    "upvc": "PVC-U",
    "pe": "HDPE",
    "pe100": "HDPE",
    "frp": "GRP",
    "p11": "1.25Cr-0.5Mo steel",
    "p22": "2.25Cr-1Mo steel",
} | {name.lower(): name for name in MATERIALS}


def material(name: str) -> Material:
    """The material a person means by ``name``; InputError lists what exists."""
    spoken = " ".join(name.lower().split())
    bare = spoken.removeprefix("stainless steel ").removeprefix("stainless ").removeprefix("ss")
    known = _ALIASES.get(spoken) or _ALIASES.get(bare.strip())
    if known is None:
        raise InputError(
            f"no material is called {name!r}",
            f"use one of {', '.join(MATERIALS)}, or a table with elastic_modulus, density, poisson",
            Place(field="pipe.material"),
        )
    return MATERIALS[known]


CONTENTS: dict[str, float] = {
    # kg/m^3 at about 20 degC and low pressure, from memory; a dense gas wants its own density.
    "water": 998.0,
    "sea water": 1025.0,
    "condensate": 960.0,
    "glycol 50 %": 1070.0,
    "diesel": 840.0,
    "petrol": 745.0,
    "crude oil": 870.0,
    "lubricating oil": 870.0,
    "ammonia (liquid)": 610.0,
    "propane (liquid)": 500.0,
    "air": 1.2,
    "gas": 1.0,
    "steam": 1.0,
    "empty": 0.0,
}

_CONTENTS_ALIASES = {
    "seawater": "sea water",
    "oil": "crude oil",
    "crude": "crude oil",
    "lube oil": "lubricating oil",
    "gasoline": "petrol",
    "glycol": "glycol 50 %",
    "glycol 50%": "glycol 50 %",
    "ammonia": "ammonia (liquid)",
    "propane": "propane (liquid)",
    "natural gas": "gas",
    "nitrogen": "air",
    "none": "empty",
    "vacuum": "empty",
}


def contents_density(name: str) -> float:
    """Density in kg/m^3 of contents by name; InputError lists what exists."""
    spoken = " ".join(name.lower().split())
    density = CONTENTS.get(_CONTENTS_ALIASES.get(spoken, spoken))
    if density is None:
        raise InputError(
            f"no contents are called {name!r}",
            f"use one of {', '.join(CONTENTS)}, or give their density",
            Place(field="contents.name"),
        )
    return density
