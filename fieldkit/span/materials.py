"""Pipe materials: modulus against temperature, density, expansion."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Material:
    """What the pipe is made of."""

    name: str
    density_kg_per_m3: float
    poisson: float
    modulus_pa: tuple[tuple[float, float], ...]
    """(temperature_k, modulus_pa) rows in rising order; one row holds at any temperature."""
    expansion_per_k: float
