"""Job, recordings and sheet in one zip file for the office."""

from __future__ import annotations

import hashlib
import io
import json
import re
import zipfile
from dataclasses import dataclass
from pathlib import Path, PurePosixPath

from fieldkit import __version__
from fieldkit.capture.sidecar import sidecar_path
from fieldkit.errors import InputError, Place
from fieldkit.job.document import Job
from fieldkit.job.store import JobText, load_text
from fieldkit.sheet.content import Document
from fieldkit.sheet.html import html
from fieldkit.sheet.markdown import markdown
from fieldkit.sheet.writing import written

MANIFEST = "manifest.json"
KIND = "fieldkit bundle"
FOLDER = "recordings"
_SAFE = re.compile(r"[\w .,+()=@-]*[\w,+()=@-]")
_DATE = (1980, 1, 1, 0, 0, 0)
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
    contents = {
        own: _with_new_places(as_worked, job, packed).text.encode("utf-8"),
        "sheet.html": html(document).encode("utf-8", "replace"),
        "sheet.md": markdown(document).encode("utf-8", "replace"),
    }
    written(path, _zipped(contents, packed, own))


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


def _zipped(contents: dict[str, bytes], packed: tuple[Packed, ...], own: str) -> bytes:
    """The zip file: the same contents give the same bytes."""
    files: list[dict[str, object]] = []
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as held:

        def add(name: str, content: bytes) -> None:
            held.writestr(_entry(name), content)
            digest = hashlib.sha256(content).hexdigest()
            files.append({"file": name, "bytes": len(content), "sha256": digest})

        for name, content in contents.items():
            add(name, content)
        for one in packed:
            add(one.name, _read(one.path))
        told = {"kind": KIND, "program": f"fieldkit {__version__}", "job": own, "files": files}
        held.writestr(_entry(MANIFEST), json.dumps(told, indent=1, ensure_ascii=False) + "\n")
    return out.getvalue()


def _entry(name: str) -> zipfile.ZipInfo:
    entry = zipfile.ZipInfo(name, _DATE)
    entry.compress_type = zipfile.ZIP_DEFLATED
    entry.external_attr = 0o644 << 16
    return entry


def _read(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as error:
        raise InputError(
            f"it cannot be read ({(error.strerror or str(error)).lower()})",
            "put it back, or take it out of the job",
            Place(path),
        ) from None
