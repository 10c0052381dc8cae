"""Job, recordings and sheet in one zip file for the office."""

from __future__ import annotations

import hashlib
import io
import json
import re
import zipfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path, PurePosixPath
from typing import BinaryIO

from fieldkit import __version__
from fieldkit.capture.sidecar import sidecar_path
from fieldkit.errors import InputError, Place
from fieldkit.files import replacing
from fieldkit.job.document import Job
from fieldkit.job.store import JobText, load_text
from fieldkit.sheet.content import Document
from fieldkit.sheet.html import html
from fieldkit.sheet.markdown import markdown
from fieldkit.sheet.writing import unwritable

MANIFEST = "manifest.json"
KIND = "fieldkit bundle"
FOLDER = "recordings"
_SAFE = re.compile(r"[\w .,+()=@-]*[\w,+()=@-]")
_DATE = (1980, 1, 1, 0, 0, 0)
_COMPRESSED = {".flac", ".ogg", ".opus", ".mp3"}
_PIECE = 1 << 20
_RESERVED = {"manifest.json", "sheet.html", "sheet.md"}


@dataclass(frozen=True)
class Packed:
    """A file that goes in: where it is, and what it is called inside."""

    name: str
    path: Path


def check_bundle(job: Job, path: Path) -> None:
    """InputError where no bundle of this job can be written there, before any work is done."""
    if path.suffix.lower() != ".zip":
        raise InputError("a bundle is a zip file", "name a file that ends in .zip", Place(path))
    if path.exists() and not is_bundle(path):
        raise InputError(
            "this file exists and is no bundle of fieldkit",
            "name another file, or remove it first",
            Place(path),
        )
    if job.path is None:
        raise InputError("the job has no file yet", "save it, then bundle it")
    for entry in job.recordings:
        if not entry.path.is_file():
            raise InputError(
                "this recording is missing, so the bundle would not be whole",
                "put it back, or take it out of the job",
                Place(entry.path),
            )


def is_bundle(path: Path) -> bool:
    """Whether a file is a bundle that an earlier run wrote."""
    try:
        with zipfile.ZipFile(path) as held:
            return bool(json.loads(held.read(MANIFEST)).get("kind") == KIND)
    except (OSError, KeyError, ValueError, zipfile.BadZipFile, AttributeError):
        return False


def write_bundle(job: Job, document: Document, path: Path, text: str | None = None) -> None:
    """Pack everything and write it in one piece; InputError where a part is missing.

    ``text`` is the job as it was worked out, where its file may be older.
    """
    check_bundle(job, path)
    assert job.path is not None
    stored = load_text(job.path)
    as_worked = stored if text is None else JobText(text, job.path)
    packed = packed_recordings(job)
    own = _safe_name(job.path.name, "job.toml")
    texts = {
        own: _with_new_places(as_worked, job, packed).text,
        "sheet.html": html(document),
        "sheet.md": markdown(document),
    }
    with unwritable(path), replacing(path) as file:
        _zip(file, texts, packed, own)


def packed_recordings(job: Job) -> tuple[Packed, ...]:
    """Recordings and what stands beside them, each once, under names that unpack safely."""
    assert job.path is not None
    taken = {name.casefold() for name in (*_RESERVED, _safe_name(job.path.name, "job.toml"))}
    found: list[Packed] = []
    for number, path in enumerate(dict.fromkeys(e.path for e in job.recordings), start=1):
        name = _inside(path, job.path.parent)
        if name is None or name.casefold() in taken or f"{name}.toml".casefold() in taken:
            name = f"{FOLDER}/{number}-{_safe_name(path.name, f'recording{path.suffix}')}"
        taken |= {name.casefold(), f"{name}.toml".casefold()}
        found.append(Packed(name, path))
        beside = sidecar_path(path)
        if beside.is_file():
            found.append(Packed(f"{name}.toml", beside))
    return tuple(found)


def _inside(path: Path, folder: Path) -> str | None:
    """The path from the job's folder, where it lies in it and any system can unpack it."""
    try:
        relative = PurePosixPath(path.absolute().relative_to(folder.absolute()).as_posix())
    except ValueError:
        return None
    if any(part == ".." or not _SAFE.fullmatch(part) for part in relative.parts):
        return None
    return str(relative)


def _safe_name(name: str, otherwise: str) -> str:
    if _SAFE.fullmatch(name) and not name.startswith("."):
        return name
    kept = re.sub(r"[^\w.+-]+", "_", name).strip("._")
    return kept if _SAFE.fullmatch(kept) else otherwise


def _with_new_places(text: JobText, job: Job, packed: tuple[Packed, ...]) -> JobText:
    """The job naming its recordings by where they lie in the bundle."""
    names = {one.path: one.name for one in packed}
    for index, entry in enumerate(job.recordings):
        if text.value(f"recording[{index}].file") != names[entry.path]:
            text = text.with_value(f"recording[{index}].file", names[entry.path])
    return text


def _zip(file: BinaryIO, texts: Mapping[str, str], packed: Sequence[Packed], own: str) -> None:
    """The zip file: the same contents give the same bytes."""
    with zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as held:
        files = [_add(held, name, _as_file(text)) for name, text in texts.items()]
        for one in packed:
            with _opened(one.path) as source:
                files.append(_add(held, one.name, source))
        told = {"kind": KIND, "program": f"fieldkit {__version__}", "job": own, "files": files}
        held.writestr(_entry(MANIFEST), json.dumps(told, indent=1, ensure_ascii=False) + "\n")


def _as_file(text: str) -> BinaryIO:
    return io.BytesIO(text.encode("utf-8", "replace"))


def _add(held: zipfile.ZipFile, name: str, source: BinaryIO) -> dict[str, object]:
    """Copy one file in, piece by piece; what the manifest says of it."""
    digest, size = hashlib.sha256(), 0
    with held.open(_entry(name), "w", force_zip64=True) as target:
        while piece := source.read(_PIECE):
            target.write(piece)
            digest.update(piece)
            size += len(piece)
    return {"file": name, "bytes": size, "sha256": digest.hexdigest()}


def _entry(name: str) -> zipfile.ZipInfo:
    entry = zipfile.ZipInfo(name, _DATE)
    packed_already = PurePosixPath(name).suffix.lower() in _COMPRESSED
    entry.compress_type = zipfile.ZIP_STORED if packed_already else zipfile.ZIP_DEFLATED
    entry.external_attr = 0o644 << 16
    return entry


def _opened(path: Path) -> BinaryIO:
    try:
        return path.open("rb")
    except OSError as error:
        raise InputError(
            f"it cannot be read ({(error.strerror or str(error)).lower()})",
            "put it back, or take it out of the job",
            Place(path),
        ) from None
