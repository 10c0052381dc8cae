"""Three invented plants as they truly are, which is not quite as their job files describe them.

The job file holds what an engineer can see and pace; here stand the stiffnesses, masses and
lengths that only the simulation knows. Stiffnesses lie within about one standard deviation of
what is usual for their kind of support.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from frame import Hold, Lump, Pipework
from member import Tube
from route import Leg

BUILT_AT_C = 20.0
EXPANSION_PER_K = 11.7e-6
"""Carbon steel, 20 to about 100 degC (from memory)."""
_MODULUS_C = (21.1, 93.3, 148.9)
_MODULUS_PA = (29.5e6 * 6894.757, 28.8e6 * 6894.757, 28.3e6 * 6894.757)
"""Carbon steel with up to 0.3 % carbon, ASME B31.1-1995, table of moduli."""


@dataclass(frozen=True)
class Condition:
    """How the pipe is while something is measured."""

    content_density: float
    """Of the bore as it is filled."""
    temperature_c: float
    pressure_pa: float = 0.0
    damping_added: float = 0.0
    """On every damping ratio: flow and warm gaskets damp more."""


@dataclass(frozen=True)
class Machine:
    """What shakes the pipe."""

    name: str
    slowest_rpm: float
    fastest_rpm: float
    rpm: float
    """While the running recording is made."""
    force_n: dict[int, float]
    """Amplitude at each order."""
    shakes_at_m: float
    shakes_along: tuple[float, float, float]


@dataclass(frozen=True)
class Hit:
    """One blow of the hammer."""

    at_s: float
    newton: float
    contact_s: float
    again_after_s: float | None = None
    """A bounce that strikes again, with 0.4 of the force."""
    slant: float = 0.0
    """Force across the meant direction, as a share of the force along it."""


@dataclass(frozen=True)
class TapSession:
    """One tap recording: where it is struck, where it is listened to, and with what."""

    file: str
    at_m: float
    axis: str
    struck_m: float
    hits: tuple[Hit, ...]
    length_s: float
    rate_hz: int
    bits: int
    full_scale: float
    """Acceleration in m/s^2 at full scale."""
    hum: dict[float, float]
    """Amplitude in m/s^2 by frequency."""
    noise: float
    """Of the sensor, in m/s^2 per root hertz."""
    ambient: float
    """What the plant around it shakes below some 300 Hz, in m/s^2 per root hertz."""
    seed: int
    cross_axis: float = 0.04


@dataclass(frozen=True)
class RunningSession:
    """One running recording of two channels, vertical and lateral."""

    file: str
    at_m: float
    length_s: float
    rate_hz: int
    full_scale: float
    flow_n: float
    """Flow noise force in newton per root hertz, at several places along the pipe."""
    noise: float
    seed: int


@dataclass(frozen=True)
class Plant:
    """Everything the simulation knows of one job."""

    folder: str
    outside_m: float
    wall_m: float
    legs: tuple[Leg, ...]
    holds: tuple[Hold, ...]
    lumps: tuple[Lump, ...]
    tapped: Condition
    running: Condition
    machine: Machine
    taps: tuple[TapSession, ...]
    run: RunningSession
    up_to_hz: float
    damping_seed: int
    damping_middle: float
    margin: float = 0.2
    keep_out_m: tuple[tuple[float, float], ...] = ()
    allow: tuple[str, ...] = ("support", "move", "stiffen", "mass")
    insulation: tuple[float, float] | None = None
    """Thickness in m and density."""
    modulus_factor: float = 1.0
    stiff_choices: tuple[float, ...] = field(default=(2e6, 5e6, 1e7, 2e7))
    """Stiffnesses in N/m that can be had for a new or a strengthened support."""

    @property
    def length_m(self) -> float:
        """Last station."""
        return sum(leg.length_m for leg in self.legs)

    def tube(self, condition: Condition) -> Tube:
        """The pipe wall and what rides on it in a condition."""
        modulus = np.interp(condition.temperature_c, _MODULUS_C, _MODULUS_PA)
        slope = (_MODULUS_PA[1] - _MODULUS_PA[0]) / (_MODULUS_C[1] - _MODULUS_C[0])
        modulus += slope * min(0.0, condition.temperature_c - _MODULUS_C[0])
        return Tube(
            self.outside_m,
            self.wall_m,
            float(modulus) * self.modulus_factor,
            content_density=condition.content_density,
            cover_kg_per_m=self._cover(),
            pressure_pa=condition.pressure_pa,
            heated_strain=EXPANSION_PER_K * (condition.temperature_c - BUILT_AT_C),
        )

    def pipework(self, condition: Condition) -> Pipework:
        """What stands there, ready for the frame."""
        looked_at = [s for tap in self.taps for s in (tap.at_m, tap.struck_m)]
        looked_at += [self.run.at_m, self.machine.shakes_at_m, *self.flow_stations]
        return Pipework(self.legs, self.tube(condition), self.holds, self.lumps, tuple(looked_at))

    @property
    def flow_stations(self) -> tuple[float, ...]:
        """Where flow noise shakes the pipe."""
        return tuple(self.length_m * share for share in (0.15, 0.35, 0.55, 0.75, 0.95))

    def _cover(self) -> float:
        if self.insulation is None:
            return 0.0
        thickness, density = self.insulation
        return density * math.pi * thickness * (self.outside_m + thickness)


def _hits(start_s: float, gap_s: float, newton: float, contact_s: float) -> tuple[Hit, ...]:
    """Four good ones, and among them one that bounces and one that is far too strong."""
    strength = (1.0, 0.62, 0.8, 3.4, 1.25, 0.9)
    again_after_s = (None, None, 0.055, None, None, None)
    slant = (0.18, -0.05, 0.22, 0.1, -0.2, 0.12)
    return tuple(
        Hit(
            at_s=start_s + i * gap_s + 0.137 * (i % 3),
            newton=newton * strength[i],
            contact_s=contact_s * (1 + 0.05 * (i % 2)),
            again_after_s=again_after_s[i],
            slant=slant[i],
        )
        for i in range(len(strength))
    )


GLYCOL_BOOSTER = Plant(
    folder="glycol-booster",
    outside_m=0.1143,
    wall_m=0.00602 * 0.975,
    legs=(Leg((1.0, 0.0, 0.0), 3.412),),
    holds=(
        Hold(0.0, {"vertical": 4.1e8, "lateral": 3.6e8, "axial": 4.4e8,
                   "rotation": 4.0e6, "twist": 3.1e6}),
        Hold(1.705, {"vertical": 3.0e6, "lateral": 2.0e6, "axial": 3.0e6,
                     "rotation": 2.2e5, "twist": 2.9e5}),
        Hold(3.412, {"vertical": 3.8e7, "lateral": 4.1e7}),
    ),
    lumps=(Lump(0.60, 31.2, (0.0, 0.0, 0.11)),),
    tapped=Condition(0.0, 18.0),
    running=Condition(1045.0, 62.0, 6e5, damping_added=0.003),
    machine=Machine(
        "booster pump", 1450.0, 1495.0, 1472.0, {1: 60.0, 2: 45.0, 7: 30.0}, 0.35, (0.1, 0.5, 0.8)
    ),
    taps=(
        TapSession("tap-vertical.flac", 1.95, "vertical", 2.65, _hits(2.2, 3.4, 450.0, 3e-3),
                   23.0, 4000, 16, 68.65, {50.0: 0.08, 100.0: 0.05}, 2e-3, 2e-3, 101),
        TapSession("tap-lateral.flac", 1.95, "lateral", 2.65, _hits(2.0, 3.5, 500.0, 3e-3),
                   23.5, 4000, 16, 68.65, {50.0: 0.09, 100.0: 0.04}, 2e-3, 2e-3, 102),
    ),
    run=RunningSession("running.flac", 1.95, 24.0, 4000, 34.32, 0.35, 4e-3, 103),
    up_to_hz=120.0,
    damping_seed=11,
    damping_middle=0.011,
    modulus_factor=1.004,
    keep_out_m=((0.0, 0.3),),
)  # fmt: skip

RISER = Plant(
    folder="riser",
    outside_m=0.1143,
    wall_m=0.00602 * 0.98,
    legs=(
        Leg((1.0, 0.0, 0.0), 1.505),
        Leg((0.0, 0.0, 1.0), 2.41, 0.1524),
        Leg((0.0, 1.0, 0.0), 2.39, 0.1524),
    ),
    holds=(
        Hold(0.0, {"vertical": 4.6e8, "lateral": 4.0e8, "axial": 5.2e8,
                   "rotation": 4.4e6, "twist": 3.8e6}),
        Hold(2.30, {"lateral": 2.6e6}),
        Hold(4.80, {"vertical": 6.5e5, "lateral": 1.6e4, "axial": 2.3e4}),
        Hold(6.305, {"vertical": 9.0e6, "lateral": 5.0e6, "axial": 5.5e6,
                     "rotation": 2.2e5, "twist": 2.6e5}),
    ),
    lumps=(Lump(4.35, 8.6),),
    tapped=Condition(998.0, 17.0, 2e5),
    running=Condition(998.0, 34.0, 4e5, damping_added=0.002),
    machine=Machine("draught fan", 735.0, 745.0, 741.0, {1: 2.6, 2: 2.0}, 4.1, (0.8, 0.5, 0.33)),
    taps=(
        TapSession("tap-vertical.flac", 4.50, "vertical", 5.30, _hits(2.5, 6.6, 550.0, 4e-3),
                   43.0, 2000, 24, 34.32, {50.0: 0.02, 24.75: 0.03}, 1.5e-3, 1e-3, 201),
        TapSession("tap-lateral.flac", 4.50, "lateral", 5.30, _hits(2.3, 6.8, 600.0, 4e-3),
                   44.0, 2000, 24, 34.32, {50.0: 0.025, 24.75: 0.04}, 1.5e-3, 1e-3, 202),
        TapSession("tap-riser-y.flac", 3.20, "y", 2.80, _hits(2.4, 5.2, 480.0, 4e-3),
                   35.0, 2000, 24, 34.32, {50.0: 0.025}, 1.5e-3, 1e-3, 204),
    ),
    run=RunningSession("running.flac", 4.5, 30.0, 2000, 34.32, 0.12, 3e-3, 203),
    up_to_hz=80.0,
    damping_seed=32,
    damping_middle=0.012,
    modulus_factor=0.996,
    keep_out_m=((4.7, 4.9),),
)  # fmt: skip

SMALL_BORE = Plant(
    folder="small-bore",
    outside_m=0.0334,
    wall_m=0.00455 * 0.985,
    legs=(Leg((0.0, 1.0, 0.0), 0.4585),),
    holds=(
        Hold(0.0, {"vertical": 1.3e8, "lateral": 1.6e8, "axial": 1.2e8,
                   "rotation": 1.5e5, "twist": 1.2e5}),
    ),
    lumps=(Lump(0.381, 3.55, (0.0, 0.0, 0.155)),),
    tapped=Condition(0.0, 22.0),
    running=Condition(14.0, 71.0, 1.2e6, damping_added=0.001),
    machine=Machine(
        "compressor", 590.0, 610.0, 598.0, {1: 3.0, 2: 6.0, 4: 2.2}, 0.15, (0.9, 0.2, 0.8)
    ),
    taps=(
        TapSession("tap-vertical.flac", 0.33, "vertical", 0.25, _hits(1.8, 2.9, 220.0, 1.5e-3),
                   19.5, 4000, 16, 98.07, {60.0: 0.15}, 3e-3, 8e-3, 301),
        TapSession("tap-lateral.flac", 0.33, "lateral", 0.25, _hits(1.7, 2.4, 220.0, 1.5e-3),
                   15.5, 48000, 16, 490.3, {60.0: 0.5}, 2.5e-4, 1.5e-2, 302),
    ),
    run=RunningSession("running.flac", 0.33, 24.0, 4000, 98.07, 0.02, 8e-3, 303),
    up_to_hz=150.0,
    damping_seed=33,
    damping_middle=0.007,
    stiff_choices=(5e5, 1e6, 2e6, 5e6),
    keep_out_m=((0.0, 0.0508), (0.3429, 0.4191)),
    allow=("support", "stiffen"),
)  # fmt: skip

PLANTS = (GLYCOL_BOOSTER, RISER, SMALL_BORE)
