"""Channel set-ups kept under a name for the next visit, per user."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from fieldkit.capture.setup import ChannelSetup, setup_from
from fieldkit.errors import InputError, Place
from fieldkit.files import replace_file

_LONGEST_NAME = 60


@dataclass(frozen=True)
class Preset:
    """An input and what its channels are connected to."""

    channels: tuple[ChannelSetup, ...]
    device: str = ""
    """Name of the input; empty: the system's own."""
    rate_hz: int | None = None


def presets_path() -> Path:
    """The user's file of presets, where this system keeps settings."""
    from platformdirs import user_config_path

    return user_config_path("fieldkit") / "presets.toml"


def presets(path: Path | None = None) -> dict[str, Preset]:
    """All presets by name; raises InputError where the file is damaged."""
    path = path or presets_path()
    try:
        tables = tomllib.loads(path.read_text("utf-8")).get("preset", {})
        return {str(name): _preset(table) for name, table in tables.items()}
    except FileNotFoundError:
        return {}
    except InputError as error:
        raise error.at(file=path) from None
    except (OSError, ValueError, TypeError, KeyError, AttributeError) as error:
        what = f"the presets cannot be read ({error})"
        raise InputError(what, "correct the file, or move it away", Place(path)) from None


def save_preset(name: str, preset: Preset, path: Path | None = None) -> None:
    """Keep a preset, in place of one of the same name; raises InputError."""
    name = name.strip()
    if not name or not name.isprintable() or len(name) > _LONGEST_NAME:
        raise InputError(
            f"{name[:_LONGEST_NAME]!r} cannot name a preset",
            f"use 1 to {_LONGEST_NAME} characters on one line",
        )
    _write({**presets(path), name: preset}, path or presets_path())


def remove_preset(name: str, path: Path | None = None) -> None:
    """Forget a preset; raises InputError where there is none of that name."""
    kept = presets(path)
    if kept.pop(name, None) is None:
        raise InputError(f"there is no preset {name!r}", f"there are: {', '.join(kept) or 'none'}")
    _write(kept, path or presets_path())


def _write(kept: dict[str, Preset], path: Path) -> None:
    import tomlkit

    text = tomlkit.dumps({"preset": {name: _table(preset) for name, preset in kept.items()}})
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        replace_file(path, text.encode("utf-8"))
    except OSError as error:
        what = f"the preset cannot be kept ({error.strerror})"
        raise InputError(what, "check the folder and the disk", Place(path)) from None


def _table(preset: Preset) -> dict[str, Any]:
    table: dict[str, Any] = {"device": preset.device} if preset.device else {}
    if preset.rate_hz is not None:
        table["rate_hz"] = preset.rate_hz
    return table | {"channel": [setup.as_table() for setup in preset.channels]}


def _preset(table: Any) -> Preset:
    rate = table.get("rate_hz")
    return Preset(
        tuple(setup_from(entry) for entry in table["channel"]),
        str(table.get("device", "")),
        None if rate is None else int(rate),
    )
