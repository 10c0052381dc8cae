"""The file beside a recording: what its channels measured, and where frames are missing.

``tap-1.wav`` has ``tap-1.wav.toml``. It is replaced in one piece, and always before the frames that
follow a gap are written, so that no gap is ever without its mark.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

from fieldkit.capture.setup import ChannelSetup, setup_from
from fieldkit.errors import InputError, Place
from fieldkit.files import replace_file

FORMAT = 1
_REMEDY = "correct it, or remove it: the samples can be read without it"


@dataclass(frozen=True)
class Gap:
    """Frames that never reached the file; nothing stands in for them."""

    frame: int
    """Index in the file of the first frame behind it."""
    lost_frames: int | None
    """None: some, nobody knows how many."""
    cause: str
    exact: bool = True
    """Whether the number is counted, not estimated with the clock."""
    earliest_frame: int | None = None
    """Where it may lie further forward: the first frame it can lie before."""

    @property
    def range(self) -> tuple[int, int]:
        """First and last frame it can lie before."""
        first = self.frame if self.earliest_frame is None else self.earliest_frame
        return first, self.frame


@dataclass(frozen=True)
class RecordingInfo:
    """Everything the sidecar tells."""

    device: str
    rate_hz: int
    channels: tuple[ChannelSetup, ...]
    started: str
    """Local date and time with offset from UTC, ISO 8601."""
    simulated: bool = False
    gaps: tuple[Gap, ...] = ()
    ended: str = ""
    """Why it ended; empty while it goes on, and after the program was killed."""
    continues: str = ""
    """File that this one goes on from."""
    set_aside: tuple[int, ...] = ()
    """Frames of blows that the user does not want to count; their samples stay."""

    def with_gap(self, gap: Gap) -> RecordingInfo:
        """With one more gap, later than the others."""
        return replace(self, gaps=(*self.gaps, gap))

    def with_set_aside(self, frame: int, aside: bool) -> RecordingInfo:
        """With the blow at a frame set aside, or taken in again."""
        others = set(self.set_aside) - {frame}
        return replace(self, set_aside=tuple(sorted(others | ({frame} if aside else set()))))


def sidecar_path(recording: Path) -> Path:
    """Where the sidecar of a recording is."""
    return recording.with_name(recording.name + ".toml")


def write_info(recording: Path, info: RecordingInfo) -> None:
    """Write the sidecar in one piece; raises OSError."""
    replace_file(sidecar_path(recording), _text(info).encode("utf-8"))


def read_info(recording: Path) -> RecordingInfo | None:
    """What the sidecar tells; None where there is none. Raises InputError where it is damaged."""
    path = sidecar_path(recording)
    try:
        table = tomllib.loads(path.read_text("utf-8"))
    except FileNotFoundError:
        return None
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise InputError(f"it cannot be read ({error})", _REMEDY, Place(path)) from None
    try:
        return _info(table)
    except InputError as error:
        raise error.at(file=path) from None
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        what = f"it does not describe a recording ({type(error).__name__}: {error})"
        raise InputError(what, _REMEDY, Place(path)) from None


def gaps_of(recording: Path) -> tuple[Gap, ...]:
    """The gaps of a recording; none where it has no sidecar."""
    info = read_info(recording)
    return info.gaps if info is not None else ()


def _text(info: RecordingInfo) -> str:
    import tomlkit

    document = tomlkit.document()
    document.add(tomlkit.comment("What the recording beside this file measured."))
    head = {key: value for key, value in asdict(info).items() if value not in ("", ())}
    document.update({"fieldkit_recording": FORMAT} | _without(head, "channels", "gaps"))
    document["channel"] = [setup.as_table() for setup in info.channels]
    if info.gaps:
        document["gap"] = [_gap_table(gap) for gap in info.gaps]
    return tomlkit.dumps(document)


def _without(table: dict[str, Any], *keys: str) -> dict[str, Any]:
    return {key: value for key, value in table.items() if key not in keys}


def _gap_table(gap: Gap) -> dict[str, Any]:
    table = {key: value for key, value in asdict(gap).items() if value is not None}
    return table if gap.lost_frames is not None else table | {"lost_frames": "unknown"}


def _info(table: Mapping[str, Any]) -> RecordingInfo:
    if table["fieldkit_recording"] != FORMAT:
        what = f"format {table['fieldkit_recording']} is not known to this version"
        raise InputError(what, "update fieldkit", Place(field="fieldkit_recording"))
    return RecordingInfo(
        device=str(table["device"]),
        rate_hz=int(table["rate_hz"]),
        channels=tuple(_channel(entry, i) for i, entry in enumerate(table["channel"])),
        started=str(table["started"]),
        simulated=bool(table["simulated"]),
        gaps=tuple(_gap(entry) for entry in table.get("gap", ())),
        ended=str(table.get("ended", "")),
        continues=str(table.get("continues", "")),
        set_aside=tuple(int(frame) for frame in table.get("set_aside", ())),
    )


def _channel(entry: Mapping[str, object], index: int) -> ChannelSetup:
    try:
        return setup_from(entry)
    except InputError as error:
        where = f"channel[{index}].{error.place.field}"
        raise InputError(error.what, error.remedy, Place(field=where)) from None


def _gap(entry: Mapping[str, Any]) -> Gap:
    lost = entry["lost_frames"]
    earliest = entry.get("earliest_frame")
    return Gap(
        frame=int(entry["frame"]),
        lost_frames=None if lost == "unknown" else int(lost),
        cause=str(entry["cause"]),
        exact=bool(entry.get("exact", True)),
        earliest_frame=None if earliest is None else int(earliest),
    )
