"""Make the sample recordings and the truth behind them: python samples/make.py [job ...].

Every number comes from the simulation in this folder with fixed seeds; fieldkit is not used.
The job files are written by hand, as an engineer writes them, and are left alone.
"""

from __future__ import annotations

import json
import math
import os
import sys
from pathlib import Path
from typing import Any

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
sys.path.insert(0, str(Path(__file__).parent))

import numpy as np
from cure import avoided, best_cures, clearance
from frame import Modes, assemble, solve
from numpy.typing import NDArray
from plants import PLANTS, Condition, Plant, TapSession
from sound import hammer_axes, noise_density, running_signal, sensor_axis, tap_signal, write_flac

Array = NDArray[np.float64]
HERE = Path(__file__).parent
HIGHEST_HZ = 1500.0
"""Modes above this get next to nothing from a soft hammer."""
HEARD_DB = 20.0
"""Energy of one decay over the density of the noise from which a mode is listed as heard."""


def step_m(plant: Plant) -> float:
    """Short enough that lumping the mass costs below 0.06 % up to four times the goal's limit."""
    return min(0.02, plant.length_m / 100)


def modes_in(plant: Plant, condition: Condition) -> Modes:
    """Modes of the true pipe in a condition."""
    return solve(assemble(plant.pipework(condition), step_m(plant)), HIGHEST_HZ, 40)


def damping_of(plant: Plant, condition: Condition, count: int) -> Array:
    """(count,) damping ratio of each mode: 0.4 to 2.5 %, scattered as joints and clamps make it."""
    rng = np.random.default_rng(plant.damping_seed)
    ratio = plant.damping_middle * np.exp(0.35 * rng.standard_normal(count))
    return np.clip(ratio + condition.damping_added, 0.004, 0.025)


def make(plant: Plant) -> None:
    """Write the recordings of one job and its truth.json."""
    folder = HERE / plant.folder
    tapped, running = (modes_in(plant, c) for c in (plant.tapped, plant.running))
    tapped_damping = damping_of(plant, plant.tapped, len(tapped.frequency_hz))
    running_damping = damping_of(plant, plant.running, len(running.frequency_hz))
    for session in plant.taps:
        signal = tap_signal(tapped, tapped_damping, session)
        path = folder / session.file
        write_flac(path, signal, session.rate_hz, session.bits, session.full_scale)
    run = plant.run
    signal = running_signal(running, running_damping, run, plant.machine, plant.flow_stations)
    write_flac(folder / run.file, signal, run.rate_hz, 16, run.full_scale)
    truth = {
        "note": "What the simulation in samples/ knows; written by samples/make.py.",
        "pipe": _pipe(plant),
        "supports": [{"at_m": hold.at_m, "springs": hold.springs} for hold in plant.holds],
        "masses": [
            {"at_m": lump.at_m, "mass_kg": lump.mass_kg, "offset_m": lump.offset_m}
            for lump in plant.lumps
        ],
        "states": {
            "tapped": _state(plant, plant.tapped, tapped, tapped_damping),
            "running": _state(plant, plant.running, running, running_damping),
        },
        "taps": [_session(s, tapped, tapped_damping) for s in plant.taps],
        "machine_rpm": plant.machine.rpm,
        "bands": avoided(plant),
        "up_to_hz": plant.up_to_hz,
        "clearance_now": clearance(running.frequency_hz, plant),
        "cures": [vars(cure) for cure in best_cures(plant)],
    }
    text = json.dumps(_rounded(truth), indent=1)
    (folder / "truth.json").write_text(text + "\n", encoding="utf-8")


def _pipe(plant: Plant) -> dict[str, Any]:
    return {
        "outside_diameter_m": plant.outside_m,
        "wall_m": plant.wall_m,
        "leg_length_m": [leg.length_m for leg in plant.legs],
        "insulation_kg_per_m": plant.tube(plant.tapped).cover_kg_per_m,
    }


def _state(plant: Plant, condition: Condition, modes: Modes, damping: Array) -> dict[str, Any]:
    return {
        "content_kg_per_m3": condition.content_density,
        "temperature_c": condition.temperature_c,
        "pressure_pa": condition.pressure_pa,
        "modulus_pa": plant.tube(condition).modulus_pa,
        "modes": [
            {"frequency_hz": f, "damping_ratio": z, **_movement(modes, i)}
            for i, (f, z) in enumerate(zip(modes.frequency_hz, damping, strict=True))
            if f < 4 * plant.up_to_hz
        ],
    }


def _movement(modes: Modes, i: int) -> dict[str, Any]:
    """Where a mode moves most and along which axis, and how it moves over all."""
    shape = modes.shape[i, :, :3]
    most = int(np.argmax(np.sum(shape**2, axis=1)))
    energy = np.sum(shape**2, axis=0)
    share = energy / np.sum(energy)
    return {
        "where_m": modes.frame.stations[most],
        "share_x_y_z": [float(s) for s in share],
    }


def _session(session: TapSession, modes: Modes, damping: Array) -> dict[str, Any]:
    return {
        "file": session.file,
        "axis": session.axis,
        "at_m": session.at_m,
        "hits": [
            {"at_s": h.at_s, "newton": h.newton, "double": h.again_after_s is not None}
            for h in session.hits
        ],
        "modes": _heard(session, modes, damping),
        "hum_hz": list(session.hum),
    }


def _heard(session: TapSession, modes: Modes, damping: Array) -> list[dict[str, Any]]:
    """Modes that the first hit makes heard, and whether they belong to another direction."""
    hit = session.hits[0]
    meant, across = hammer_axes(modes, session)
    struck = modes.along(session.struck_m, meant + hit.slant * across)
    felt = modes.along(session.at_m, sensor_axis(modes, session))
    straight = modes.along(session.at_m, session.axis)
    moves = np.linalg.norm(modes.shape[:, modes.frame.node(session.at_m), :3], axis=1)
    heard = []
    for i, f in enumerate(modes.frequency_hz):
        omega = 2 * math.pi * f
        push = hit.newton * abs(_half_sine(omega, hit.contact_s))
        amplitude = omega * push * abs(float(struck[i] * felt[i]))
        energy = amplitude**2 / (4 * damping[i] * omega)
        decibel = 10 * math.log10(max(energy, 1e-30) / (noise_density(session, f) / 2))
        if decibel > HEARD_DB and f < 0.4 * session.rate_hz:
            heard.append(
                {
                    "frequency_hz": f,
                    "damping_ratio": damping[i],
                    "amplitude": amplitude,
                    "energy_db": decibel,
                    "leaked": bool(abs(straight[i]) < 0.3 * moves[i]),
                }
            )
    return heard


def _half_sine(omega: float, contact_s: float) -> float:
    """Transform of a half-sine pulse of unit height, as a magnitude in seconds."""
    beat = (omega * contact_s / math.pi) ** 2
    if abs(1 - beat) < 1e-6:
        return contact_s / 2
    return 2 * contact_s / math.pi * math.cos(omega * contact_s / 2) / (1 - beat)


def _rounded(value: Any) -> Any:
    """Seven significant digits, plain Python types."""
    if isinstance(value, dict):
        return {key: _rounded(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_rounded(item) for item in value]
    if isinstance(value, float | np.floating):
        return float(f"{float(value):.7g}")
    return value


if __name__ == "__main__":
    wanted = sys.argv[1:] or [plant.folder for plant in PLANTS]
    for plant in PLANTS:
        if plant.folder in wanted:
            make(plant)
            print(f"{plant.folder}: written")
