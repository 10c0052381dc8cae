"""The verdict on a blow: whether it counts, and if not, what to change."""

from __future__ import annotations

from dataclasses import dataclass

USABLE = "usable"
CLIPPED = "clipped"
DOUBLE = "double"
WEAK = "weak"
CUT_SHORT = "cut short"
MACHINE = "machine too loud"
GAP = "frames missing"
NO_BLOW = "no blow"
REFUSED = "not usable"
NO_FORCE = "no force"

CHANGES = {
    USABLE: "",
    CLIPPED: "lower the input level, or strike softer",
    DOUBLE: "let the hammer rebound once, held loosely, and wait until it is armed again",
    WEAK: "strike harder, use a softer tip, or move the sensor nearer",
    CUT_SHORT: "strike again and touch nothing until it has died away: the next record is longer",
    MACHINE: "stop the machine, or strike harder",
    GAP: "strike again",
    NO_BLOW: "keep the place quiet, then strike once",
    REFUSED: "strike again",
    NO_FORCE: "strike harder, and check the hammer's cable, its supply and its channel",
}
"""What to do about each verdict."""


@dataclass(frozen=True)
class Verdict:
    """Whether a blow counts, and if not, what to change."""

    kind: str
    """``usable``, ``clipped``, ``double``, ``weak``, ``cut short``, ``machine too loud``,
    ``frames missing``, ``no blow``, ``no force`` or ``not usable``."""
    what: str = ""
    """What was seen; empty for a usable one."""

    @property
    def usable(self) -> bool:
        """Whether it counts."""
        return self.kind == USABLE

    @property
    def weak(self) -> bool:
        """Whether too little was heard to say more."""
        return self.kind in (WEAK, NO_BLOW, MACHINE)

    @property
    def change(self) -> str:
        """What to change before the next blow."""
        return CHANGES[self.kind]

    def __str__(self) -> str:
        return f"{self.kind}: {self.what}; {self.change}" if self.what else self.kind
