"""What libraries print on descriptor 2 is caught; what Python writes arrives where it did."""

from __future__ import annotations

import os
import subprocess
import sys
from contextlib import suppress

import pytest

CODE = """
import os, sys
from fieldkit.capture.quiet import caught_messages, libraries_kept_quiet
print("before", file=sys.stderr)
with libraries_kept_quiet():
    os.write(2, b"from a library\\n")
    print("inside", file=sys.stderr)
    with libraries_kept_quiet():
        os.write(2, b"again\\n")
        sys.__stderr__.write("deeper\\n")
    os.write(2, b"still\\n")
    print(repr(caught_messages()), repr(caught_messages()))
    os.write(2, b"x" * 1000000)
    print(len(caught_messages()))
os.write(2, b"after\\n")
print("end", file=sys.stderr)
"""


def run(code):
    return subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True
    )


def test_descriptor_2_is_turned_aside_and_back():
    ran = run(CODE)
    assert ran.stderr.split() == ["before", "inside", "deeper", "after", "end"]
    assert ran.stdout.splitlines() == ["'from a library\\nagain\\nstill\\n' ''", "262144"]


def test_a_closed_standard_error_is_no_trouble():
    code = """
import os, sys
os.close(2)
from fieldkit.capture.quiet import libraries_kept_quiet
with libraries_kept_quiet():
    print("fine")
"""
    assert run(code).stdout == "fine\n"


SCREEN = """
import os
from textual.app import App
from textual.widgets import Static
from fieldkit.capture.quiet import libraries_kept_quiet

class Small(App):
    def compose(self):
        yield Static("drawn by the app")

    def on_mount(self):
        os.write(2, b"printed by a library")
        self.set_timer(0.3, self.exit)

with libraries_kept_quiet():
    Small().run()
"""


@pytest.mark.skipif(sys.platform == "win32", reason="the app draws on standard output there")
def test_a_library_cannot_print_on_the_screen_of_the_app():
    import pty

    ours, theirs = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-c", SCREEN], stdin=theirs, stdout=theirs, stderr=theirs
    )
    os.close(theirs)
    screen = b""
    with suppress(OSError):
        while chunk := os.read(ours, 65536):
            screen += chunk
    os.close(ours)
    assert process.wait(60.0) == 0
    assert b"drawn by the app" in screen
    assert b"library" not in screen
