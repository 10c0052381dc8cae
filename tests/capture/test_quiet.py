"""What libraries print on descriptor 2 is caught; what Python writes arrives where it did."""

from __future__ import annotations

import subprocess
import sys

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
