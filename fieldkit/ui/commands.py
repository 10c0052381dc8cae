"""What the command palette offers and what the help window lists."""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from textual.binding import Binding


class Command(NamedTuple):
    """One thing the app can do."""

    name: str
    action: str
    help: str


COMMANDS = (
    Command("Tap", "view('tap')", "Recordings, taps and measured modes"),
    Command("Running", "view('running')", "What it does while the machine runs"),
    Command("Span", "view('span')", "Describe the pipe; computed modes and shapes"),
    Command("Match", "view('match')", "Measured against computed"),
    Command("Detune", "view('detune')", "Ranked changes"),
    Command("Sheet", "view('sheet')", "The advice as text"),
    Command("Guided tap test", "measure('tap')", "Tap now, with an input or the practice rig"),
    Command("Running recording", "measure('running')", "Record the running machine now"),
    Command("Practise", "practise", "Tap a simulated pipe: no sensor needed"),
    Command("Open a job", "open", "Pick a job file"),
    Command("New job", "new", "Describe a new pipe, step by step"),
    Command("Sample job", "sample", "Copy the sample jobs out and open one"),
    Command("Save", "save", "Write the job file"),
    Command("Save as", "save_as", "Write the job under another name"),
    Command("Undo", "undo", "Take the last change of the job back"),
    Command("Redo", "redo", "Make the change again that was taken back"),
    Command("Edit the file", "edit_text", "The job file in your own editor, and back"),
    Command("SI or US units", "units", "Show everything in the other units"),
    Command("Start screen", "start", "New, open, sample, recent jobs"),
    Command("Work out again", "rerun", "Run the whole chain again"),
    Command("Stop", "stop", "Stop what is being worked out"),
    Command("Colours", "toggle_light", "Dark, light, high contrast, or no colour at all"),
    Command("Copy view as text", "copy_view", "Everything on screen as plain text"),
    Command("How it is computed", "how", "Formula and source of the numbers on screen"),
    Command("Keys", "help", "List every key"),
    Command("Quit", "quit", "Leave, asking first when something is unsaved"),
)


def help_text(sections: Iterable[tuple[str, Iterable[object]]]) -> str:
    """Keys and what they do, by section: (title, bindings)."""
    blocks = [f"{title}\n{_lines(bindings)}" for title, bindings in sections]
    return "\n\n".join(blocks)


def _lines(bindings: Iterable[object]) -> str:
    known = [
        binding for binding in bindings if isinstance(binding, Binding) and binding.description
    ]
    return "\n".join(
        f"  {_keys(binding):<12} {binding.tooltip or binding.description}" for binding in known
    )


def _keys(binding: Binding) -> str:
    names = {"question_mark": "?", "delete": "del", "left_square_bracket": "["}
    keys = binding.key_display or binding.key
    return " ".join(names.get(key, key) for key in keys.split(","))
