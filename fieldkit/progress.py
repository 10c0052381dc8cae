"""How long work tells what it is doing and asks whether to stop."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from fieldkit.errors import Cancelled


def _say_nothing(_message: str, _fraction: float) -> None:
    pass


def _never() -> bool:
    return False


@dataclass(frozen=True)
class Progress:
    """Handed down into long work; the default is silent and never stops."""

    on_step: Callable[[str, float], None] = _say_nothing
    """Called with what is being done and how far it is, 0 to 1."""
    stop: Callable[[], bool] = _never

    def step(self, message: str, fraction: float) -> None:
        """Report a step; raises Cancelled when the user asked to stop."""
        if self.stop():
            raise Cancelled("stopped on request")
        self.on_step(message, fraction)
