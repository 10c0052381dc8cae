"""Documents that cannot rot: their links lead somewhere, their commands are commands."""

from __future__ import annotations

import re
import shlex
from collections.abc import Iterator
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import pytest
import typer

from fieldkit.cli.commands import app

ROOT = Path(__file__).parents[2]
DOCUMENTS = sorted([ROOT / "README.md", ROOT / "DEVELOPERS.md", *(ROOT / "docs").glob("*.md")])
COMMANDS: dict[str, Any] = typer.main.get_command(app).commands  # type: ignore[attr-defined]
_LINK = re.compile(r"!?\[[^\]]*\]\(([^)#\s]+)(#[^)\s]*)?\)")
_SHELL = re.compile(r"^```sh\n(.*?)^```$", re.MULTILINE | re.DOTALL)
_INLINE = re.compile(r"`(fieldkit [^`]+)`")


def documents() -> list[object]:
    return [pytest.param(path, id=path.name) for path in DOCUMENTS]


def commands_of(text: str) -> Iterator[list[str]]:
    """Every call of the program or of Python in the text, as words."""
    for block in _SHELL.findall(text):
        for line in block.splitlines():
            words = shlex.split(line, comments=True)
            for word in ("&&", "|", ";"):
                assert word == "|" or word not in words or "pip" in line or "ruff" in line, line
            if words:
                yield words[: words.index("|")] if "|" in words else words
    yield from (shlex.split(call) for call in _INLINE.findall(text))


def links_of(path: Path) -> list[str]:
    """Files of the repository that a document links to or shows."""
    return [link for link, _ in _LINK.findall(path.read_text("utf-8")) if "://" not in link]


@pytest.mark.parametrize("path", documents())
def test_every_link_leads_to_a_file(path: Path) -> None:
    links = links_of(path)
    missing = [link for link in links if not (path.parent / link).exists()]
    assert not missing


@pytest.mark.parametrize("path", documents())
def test_every_command_is_one(path: Path) -> None:
    """A call of fieldkit names a command with options it has; files of the repository exist."""
    for words in commands_of(path.read_text("utf-8")):
        if Path(words[0]).name == "fieldkit":
            check_call(words[1:])


@pytest.mark.parametrize("path", documents())
def test_every_python_module_and_script_named_exists(path: Path) -> None:
    for words in commands_of(path.read_text("utf-8")):
        if not Path(words[0]).name.startswith("python"):
            continue
        if words[1] == "-m":
            assert find_spec(words[2]) is not None, words
        else:
            assert (ROOT / words[1]).exists(), words


def check_call(words: list[str]) -> None:
    """Raise AssertionError where the program has no such command or option."""
    if not words or words[0].startswith("-"):
        return
    command = COMMANDS.get(words[0])
    if command is None:
        assert words[0].isupper() or (ROOT / words[0]).exists(), words
        return
    options = {name for parameter in command.params for name in parameter.opts} | {"--help"}
    unknown = [word for word in words[1:] if word.startswith("-") and word not in options]
    assert not unknown, (words[0], unknown)
    files = [word for word in words[1:] if word.startswith("samples/")]
    assert all((ROOT / name).exists() for name in files), files


@pytest.mark.parametrize("name", sorted(COMMANDS))
def test_every_command_shows_an_example_that_is_a_call(name: str) -> None:
    """The example of each help text stands the same check as the documents."""
    example = COMMANDS[name].epilog or ""
    assert example.startswith("Example: fieldkit")
    check_call(shlex.split(example.removeprefix("Example: "))[1:])


@pytest.mark.parametrize("page", ["README.md", "docs/file-formats.md"])
def test_every_command_is_told(page: str) -> None:
    """To whoever is new, and to whoever reads its JSON; ``open`` is what the program does alone."""
    text = (ROOT / page).read_text("utf-8")
    told = set(re.findall(r"\w+", " ".join(re.findall(r"`fieldkit [^`]*`|^###.*$", text, re.M))))
    assert not set(COMMANDS) - {"open"} - told
