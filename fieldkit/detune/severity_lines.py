"""The published lines that a vibration level is screened against, as formulas in SI."""

from __future__ import annotations

import math

PSI_PA = 6894.757293168
INCH_M = 0.0254
MM_PER_S = 1e-3

ENDURANCE_PA = 13000 * PSI_PA
"""Zero to peak, carbon steel; used with the two factors below (Wachel, Morton and Atkins 1990,
from memory)."""
STRESS_CONCENTRATION = 5.0
SAFETY_FACTOR = 2.0
NOMINAL_STRESS_PA = ENDURANCE_PA / (STRESS_CONCENTRATION * SAFETY_FACTOR)

OM3_BETA = 3.64e-3 * INCH_M / PSI_PA
"""m/s per Pa."""
OM3_STRESS_PA = 7690 * PSI_PA
"""0.8 S_A / alpha of carbon steel."""
OM3_C1, OM3_C3, OM3_C4, OM3_C2K2 = 0.15, 1.5, 0.7, 4.0
"""The defaults where a span is not looked at closely: concentrated masses, contents and
insulation, shape, stress indices."""

ISO_ZONES_M_PER_S = {"A/B": 12.7e-3, "B/C": 19.0e-3, "C/D": 28.5e-3}
"""Overall rms of dampers and piping, ISO 20816-8:2018 (from memory)."""

API618_DISPLACEMENT_M = 0.5e-3
API618_VELOCITY_M_PER_S = 32e-3
"""Both peak to peak, API 618 5th edition (from memory)."""
API618_CORNER_HZ, API618_HIGHEST_HZ = 10.0, 200.0

GUIDELINE_HZ = (1.0, 300.0)


def om3_velocity(mass_ratio: float, off_resonance: float = 1.0) -> float:
    """Velocity, zero to peak in m/s, in the style of ASME OM part 3 (from memory).

    ``mass_ratio`` is that of pipe, contents and insulation to the bare pipe (C3 is its root),
    ``off_resonance`` C5: first natural over measured frequency where forced below it, else 1.
    """
    factors = OM3_C1 * OM3_C4 / (math.sqrt(mass_ratio) * off_resonance)
    return factors * OM3_BETA * OM3_STRESS_PA / OM3_C2K2


def concern_m_per_s(frequency_hz: float) -> float:
    """Concern line, rms, Energy Institute guideline, 2nd ed. 2008 (constants from memory)."""
    return float(10 ** ((math.log10(frequency_hz) + 0.48017) / 2.127612) * MM_PER_S)


def problem_m_per_s(frequency_hz: float) -> float:
    """Problem line of the same guideline, rms (constants from memory)."""
    return float(10 ** ((math.log10(frequency_hz) + 1.871083) / 2.084547) * MM_PER_S)


def iso_zone(overall_rms_m_per_s: float) -> str:
    """Zone letter of ISO 20816-8 for dampers and piping."""
    above = sum(overall_rms_m_per_s > limit for limit in ISO_ZONES_M_PER_S.values())
    return "ABCD"[above]


def api618_velocity(frequency_hz: float) -> float:
    """Design line in m/s, peak to peak, constant displacement below its corner."""
    if frequency_hz >= API618_CORNER_HZ:
        return API618_VELOCITY_M_PER_S
    return 2 * math.pi * frequency_hz * API618_DISPLACEMENT_M
