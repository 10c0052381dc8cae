"""Changes to a span: what a person could do about it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Protocol

from fieldkit.span.layout import PointMass, Span, Support

Json = Mapping[str, object]


class Change(Protocol):
    """One thing done to a span."""

    @property
    def kind(self) -> str:
        """Family: ``support``, ``move``, ``stiffen``, ``mass``, ``pair``, ``speed``..."""
        ...

    def apply(self, span: Span) -> Span:
        """The span after the change."""
        ...

    def as_json(self) -> Json:
        """The change as the command line writes it, SI units in the keys."""
        ...


def _swap_support(span: Span, index: int, support: Support) -> Span:
    supports = (*span.supports[:index], support, *span.supports[index + 1 :])
    return replace(span, supports=supports)


def _swap_mass(span: Span, index: int, mass: PointMass) -> Span:
    masses = (*span.masses[:index], mass, *span.masses[index + 1 :])
    return replace(span, masses=masses)


@dataclass(frozen=True)
class AddSupport:
    """A new support; a direction left None is not restrained by it."""

    at_m: float
    vertical_n_per_m: float | None = None
    lateral_n_per_m: float | None = None
    axial_n_per_m: float | None = None
    rotation_n_m_per_rad: float | None = None
    kind: str = "support"

    def apply(self, span: Span) -> Span:
        """The span with the support behind the existing ones."""
        support = Support(
            self.at_m,
            "free",
            vertical=self.vertical_n_per_m or 0.0,
            lateral=self.lateral_n_per_m or 0.0,
            axial=self.axial_n_per_m or 0.0,
            rotation=self.rotation_n_m_per_rad or 0.0,
        )
        return replace(span, supports=(*span.supports, support))

    def as_json(self) -> Json:
        """``add_support`` with the restrained directions only."""
        stated = {
            "vertical_n_per_m": self.vertical_n_per_m,
            "lateral_n_per_m": self.lateral_n_per_m,
            "axial_n_per_m": self.axial_n_per_m,
            "rotation_n_m_per_rad": self.rotation_n_m_per_rad,
        }
        restrained = {key: value for key, value in stated.items() if value is not None}
        return {"add_support": {"at_m": self.at_m, **restrained}}


@dataclass(frozen=True)
class MoveSupport:
    """An existing support at another station, as stiff as it was."""

    index: int
    to_m: float
    kind: str = "move"

    def apply(self, span: Span) -> Span:
        """The span with that support moved."""
        moved = replace(span.supports[self.index], at_m=self.to_m)
        return _swap_support(span, self.index, moved)

    def as_json(self) -> Json:
        """``move_support``."""
        return {"move_support": {"index": self.index, "to_m": self.to_m}}


@dataclass(frozen=True)
class StiffenSupport:
    """An existing support brought to a new total stiffness in some directions."""

    index: int
    vertical_n_per_m: float | None = None
    lateral_n_per_m: float | None = None
    rotation_n_m_per_rad: float | None = None
    kind: str = "stiffen"

    def apply(self, span: Span) -> Span:
        """The span with the stated stiffnesses in place of the old ones."""
        old = span.supports[self.index]
        new = replace(
            old,
            vertical=old.vertical if self.vertical_n_per_m is None else self.vertical_n_per_m,
            lateral=old.lateral if self.lateral_n_per_m is None else self.lateral_n_per_m,
            rotation=old.rotation
            if self.rotation_n_m_per_rad is None
            else self.rotation_n_m_per_rad,
        )
        return _swap_support(span, self.index, new)

    def as_json(self) -> Json:
        """``stiffen_support`` with new totals."""
        stated = {
            "vertical_n_per_m": self.vertical_n_per_m,
            "lateral_n_per_m": self.lateral_n_per_m,
            "rotation_n_m_per_rad": self.rotation_n_m_per_rad,
        }
        changed = {key: value for key, value in stated.items() if value is not None}
        return {"stiffen_support": {"index": self.index, **changed}}


@dataclass(frozen=True)
class AddMass:
    """A clamped-on mass on the centre line."""

    at_m: float
    mass_kg: float
    kind: str = "mass"

    def apply(self, span: Span) -> Span:
        """The span with the mass behind the existing ones."""
        added = PointMass(self.at_m, self.mass_kg, "added mass", tolerance=0.02)
        return replace(span, masses=(*span.masses, added))

    def as_json(self) -> Json:
        """``add_mass``."""
        return {"add_mass": {"at_m": self.at_m, "mass_kg": self.mass_kg}}


@dataclass(frozen=True)
class SetMass:
    """An existing mass made lighter or heavier; 0 removes it."""

    index: int
    mass_kg: float
    kind: str = "mass"

    def apply(self, span: Span) -> Span:
        """The span with that mass changed."""
        return _swap_mass(span, self.index, replace(span.masses[self.index], mass_kg=self.mass_kg))

    def as_json(self) -> Json:
        """``set_mass``."""
        return {"set_mass": {"index": self.index, "mass_kg": self.mass_kg}}


@dataclass(frozen=True)
class MoveMass:
    """An existing mass at another station."""

    index: int
    to_m: float
    kind: str = "mass"

    def apply(self, span: Span) -> Span:
        """The span with that mass moved."""
        return _swap_mass(span, self.index, replace(span.masses[self.index], at_m=self.to_m))

    def as_json(self) -> Json:
        """``move_mass``."""
        return {"move_mass": {"index": self.index, "to_m": self.to_m}}


@dataclass(frozen=True)
class AllOf:
    """Several changes done together; each names supports and masses as they are numbered now."""

    parts: tuple[Change, ...]
    kind: str = "pair"

    def apply(self, span: Span) -> Span:
        """The span with every part made: what is added stands behind what was there."""
        for part in self.parts:
            span = part.apply(span)
        return span

    def as_json(self) -> Json:
        """``all_of`` a list of single changes."""
        return {"all_of": [part.as_json() for part in self.parts]}


@dataclass(frozen=True)
class ChangeSpeed:
    """A machine kept to another speed range; the pipe stays as it is."""

    excitation: str
    low_hz: float
    """Revolutions per second."""
    high_hz: float
    manner: str = "keep"
    """``keep`` to a part of its range, ``slower`` or ``faster``."""
    kind: str = "speed"

    def apply(self, span: Span) -> Span:
        """The same span."""
        return span

    def as_json(self) -> Json:
        """``change_speed``."""
        low_rpm, high_rpm = round(60 * self.low_hz, 1), round(60 * self.high_hz, 1)
        return {
            "change_speed": {
                "excitation": self.excitation,
                "low_rpm": low_rpm,
                "high_rpm": high_rpm,
            }
        }


@dataclass(frozen=True)
class AddAbsorber:
    """A small mass on a spring and a damper, tuned against one mode, moving one way."""

    at_m: float
    mass_kg: float
    stiffness_n_per_m: float
    damping_n_s_per_m: float
    direction: str = "vertical"
    kind: str = "absorber"

    def apply(self, span: Span) -> Span:
        """The same span: the absorber is a system of its own on it."""
        return span

    def as_json(self) -> Json:
        """``add_absorber``."""
        return {
            "add_absorber": {
                "at_m": self.at_m,
                "mass_kg": self.mass_kg,
                "stiffness_n_per_m": self.stiffness_n_per_m,
                "damping_n_s_per_m": self.damping_n_s_per_m,
            }
        }
