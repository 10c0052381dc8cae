"""The map of the house shows rooms that are there."""

from __future__ import annotations

import re
import tomllib

import pytest

from tests.docs.test_documents import ROOT

TEXT = (ROOT / "DEVELOPERS.md").read_text("utf-8")
_TICKED = re.compile(r"`([\w./*-]+)`")
_ROOTS = ("fieldkit/", "tests/", "docs/", "samples/", ".ci/")
PLACES = sorted({name for name in _TICKED.findall(TEXT) if name.startswith(_ROOTS)})
MODULES = sorted({n for n in _TICKED.findall(TEXT) if n.endswith(".py") and n not in PLACES})


@pytest.mark.parametrize("place", PLACES)
def test_every_place_named_is_there(place: str) -> None:
    assert list(ROOT.glob(place.rstrip("/"))), place


@pytest.mark.parametrize("module", MODULES)
def test_every_module_named_by_its_file_alone_is_somewhere(module: str) -> None:
    """Such names follow the full name of a neighbour."""
    assert [*ROOT.glob(f"fieldkit/**/{module}"), *ROOT.glob(f"tests/**/{module}")], module


def test_every_package_has_its_line_on_the_map() -> None:
    """A new room is put on the map; one of the tests too, where it is named after none."""
    rooms = {str(path.parent.relative_to(ROOT)) for path in ROOT.glob("fieldkit/**/__init__.py")}
    rooms |= {str(path.parent.relative_to(ROOT)) for path in ROOT.glob("tests/*/__init__.py")}
    mapped = set(re.findall(r"`([\w/]+)`", TEXT.split("## The map")[1].split("## Where")[0]))
    of_a_part = {room for room in rooms if room.replace("tests/", "fieldkit/", 1) in rooms - {room}}
    assert not rooms - {"fieldkit"} - mapped - of_a_part


def test_every_dependency_has_its_reason() -> None:
    """Each package of pyproject.toml stands in docs/dependencies.md."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]
    extras = project["optional-dependencies"]
    wanted = [*project["dependencies"], *extras["test"], *extras["outside"], *extras["check"]]
    told = (ROOT / "docs" / "dependencies.md").read_text("utf-8")
    names = [re.split(r"[<>=!~ ]", one)[0] for one in wanted]
    assert not [n for n in names if n not in told and n.removeprefix("pytest-") not in told]


@pytest.mark.parametrize("page", sorted(p.name for p in (ROOT / "docs").glob("*.md")))
def test_every_module_a_document_names_is_there(page: str) -> None:
    """By its full name, or as seen from the package."""
    text = (ROOT / "docs" / page).read_text("utf-8")
    named = {name for name in _TICKED.findall(text) if name.endswith((".py", "/"))}
    roots = [ROOT, ROOT / "fieldkit"]
    lost = {
        name
        for name in named
        if not any(list(root.glob(one)) for root in roots for one in (name, f"**/{name}"))
    }
    assert not lost
