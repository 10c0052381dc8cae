"""Run a command in this process, as a person or a program would."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

from typer.testing import CliRunner

from fieldkit.cli.commands import app


@dataclass(frozen=True)
class Ran:
    """What a command left behind."""

    status: int
    out: str
    err: str

    @property
    def document(self) -> dict[str, Any]:
        """Standard output as the one JSON document it must be."""
        return json.loads(self.out)


def fieldkit(*words: object) -> Ran:
    """Run ``fieldkit`` with these words."""
    result = CliRunner().invoke(app, [str(word) for word in words], prog_name="fieldkit")
    return Ran(result.exit_code, result.stdout, result.stderr)
