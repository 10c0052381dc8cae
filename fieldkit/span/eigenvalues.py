"""Natural frequencies of uniform slender spans in closed form.

Every function returns eigenvalues b = beta L of the Euler-Bernoulli beam in rising order, so that
f = b^2 / (2 pi L^2) sqrt(EI / m). Nothing is tabulated: each characteristic equation is divided by
cosh b, which keeps it bounded, and each root lies alone between two roots of simpler equations
(Rayleigh's theorem on constraints), where a bracketing root finder takes it to machine accuracy.

Symbols: l = b/2 on a half span; mu = M/(m L) a point mass over the mass of the span;
kappa = K L^3/EI and rho = k_r L/EI a translational and a rotational spring over those of the span.

Sources: S. P. Timoshenko, Vibration Problems in Engineering (from memory); W. T. Thomson, Theory
of Vibration with Applications, appendix D, for the single spans.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Eigenvalues = NDArray[np.float64]

END_CONDITIONS = (
    "clamped-free",
    "pinned-pinned",
    "clamped-pinned",
    "clamped-clamped",
    "free-free",
    "free-pinned",
    "clamped-guided",
    "free-guided",
    "pinned-guided",
    "guided-guided",
)
RIGID_MODES = {"free-free": 2, "free-pinned": 1, "free-guided": 1, "guided-guided": 1}
"""Motions of no frequency that a span with these ends has besides its elastic modes."""
NODE_STIFFNESS_RATIO = 4 * (2 * math.pi) ** 3 / math.tanh(math.pi)
"""Least K L^3/EI (995.91) that makes a spring in the middle of a pinned span of length L a node."""

_SAME_ELASTIC_MODES = {
    "free-free": "clamped-clamped",
    "free-pinned": "clamped-pinned",
    "free-guided": "clamped-guided",
    "guided-guided": "pinned-pinned",
}
_ROOT_TOLERANCE = 1e-13
_ALMOST_ZERO = 1e-4


def frequency_hz(
    eigenvalue: float, length_m: float, bending_stiffness_n_m2: float, mass_kg_per_m: float
) -> float:
    """f = b^2 / (2 pi L^2) sqrt(EI / m)."""
    speed = math.sqrt(bending_stiffness_n_m2 / mass_kg_per_m)
    return eigenvalue**2 / (2 * math.pi * length_m**2) * speed


def single_span(ends: str, count: int = 5) -> Eigenvalues:
    """Elastic modes of a single span, shape (count,).

    clamped-free cos b cosh b = -1; clamped-clamped and free-free cos b cosh b = 1; clamped-pinned
    and free-pinned tan b = tanh b; clamped-guided and free-guided tan b = -tanh b; pinned-pinned
    and guided-guided b = n pi; pinned-guided b = (2n - 1) pi/2. Guided is free to move, not to
    turn. Raises ValueError for other ends.
    """
    n: Eigenvalues = np.arange(1, count + 1, dtype=np.float64)
    kind = _SAME_ELASTIC_MODES.get(ends, ends)
    if kind == "pinned-pinned":
        return n * math.pi
    if kind == "pinned-guided":
        return (n - 0.5) * math.pi
    if kind not in _SINGLE_SPAN:
        raise ValueError(f"no end condition {ends!r}; known are {', '.join(END_CONDITIONS)}")
    equation, low, high = _SINGLE_SPAN[kind]
    return _roots(equation, (n + low) * math.pi, (n + high) * math.pi)


def equal_spans(spans: int, ends: str, count: int = 5) -> Eigenvalues:
    """N equal spans over rigid simple supports, b = beta l of ONE span, shape (count,).

    Three-moment condition (coth b - cot b) + (csc b - csch b) cos theta = 0 with theta = k pi/N
    (k = 1..N-1) for outer ends both pinned or both clamped, (2k - 1) pi/(2N) (k = 1..N) for
    clamped-pinned. Pinned ends add b = j pi, clamped ends the clamped single span. The modes come
    in groups of N, the j-th between j pi and the j-th clamped eigenvalue.
    """
    if ends == "clamped-pinned":
        thetas = [(2 * k - 1) * math.pi / (2 * spans) for k in range(1, spans + 1)]
    elif ends in ("pinned-pinned", "clamped-clamped"):
        thetas = [k * math.pi / spans for k in range(1, spans)]
    else:
        raise ValueError(f"equal spans end pinned or clamped, not {ends!r}")
    groups = -(-count // spans)
    low, high = single_span("pinned-pinned", groups), single_span("clamped-clamped", groups)
    found = [_roots(_three_moment(theta), low, high) for theta in thetas]
    if ends != "clamped-pinned":
        found.append(single_span(ends, groups))
    return np.sort(np.concatenate(found))[:count]


def cantilever_with_tip_mass(mu: float, count: int = 5) -> Eigenvalues:
    """1 + cos b cosh b = mu b (sin b cosh b - cos b sinh b), shape (count,)."""
    return _between(
        _clamped_free,
        lambda b: -mu * b * _clamped_pinned(b),
        _behind_rigid(single_span("clamped-pinned", count)),
        single_span("clamped-free", count),
        mu,
    )


def cantilever_on_root_spring(rho: float, count: int = 5) -> Eigenvalues:
    """Free span whose root turns against a spring rho = k_r L/EI and does not move, (count,).

    1 + cos b cosh b = (b/rho) (sin b cosh b - cos b sinh b): the equation of the tip mass with
    1/rho in place of mu. Raises ValueError for rho of zero, a mechanism.
    """
    if rho <= 0:
        raise ValueError("a root free to turn holds nothing")
    return cantilever_with_tip_mass(1 / rho, count)


def pinned_with_centre_mass(mu: float, count: int = 5) -> Eigenvalues:
    """Symmetric modes of a pinned span with a mass in the middle, shape (count,).

    tan l - tanh l = 4/(mu b). The antisymmetric modes, b = 2 n pi, do not feel the mass.
    """
    return 2 * _between(
        lambda x: -2 * math.cos(x),
        lambda x: mu * x * _clamped_pinned(x),
        _behind_rigid(single_span("clamped-pinned", count)),
        single_span("pinned-guided", count),
        mu,
    )


def clamped_with_centre_mass(mu: float, count: int = 5) -> Eigenvalues:
    """Symmetric modes of a clamped span with a mass in the middle, shape (count,).

    2 (cos l sinh l + sin l cosh l) = mu b (1 - cos l cosh l).
    """
    return 2 * _between(
        _clamped_guided,
        lambda x: mu * x * _clamped_clamped(x),
        _behind_rigid(single_span("clamped-clamped", count)),
        single_span("clamped-guided", count),
        mu,
    )


def on_end_springs(kappa: float, count: int = 5) -> Eigenvalues:
    """Symmetric modes of a span on two equal springs, ends free to turn, shape (count,).

    tan l + tanh l = 2 kappa/b^3 with kappa = K L^3/EI of each end.
    """
    return 2 * _between(
        lambda x: 4 * x**3 * _clamped_guided(x),
        lambda x: -kappa * math.cos(x),
        _behind_rigid(single_span("free-guided", count)),
        single_span("pinned-guided", count),
        kappa,
    )


def pinned_with_centre_spring(kappa: float, count: int = 5) -> Eigenvalues:
    """Symmetric modes of a pinned span of length L with a spring in the middle, shape (count,).

    tanh l - tan l = 4 b^3/kappa. The antisymmetric modes b = 2 n pi stay; from
    ``NODE_STIFFNESS_RATIO`` on the lowest of them is the first mode of the span.
    """
    return 2 * _between(
        lambda x: 32 * x**3 * math.cos(x),
        lambda x: kappa * _clamped_pinned(x),
        single_span("pinned-guided", count),
        single_span("clamped-pinned", count),
        kappa,
    )


def pinned_with_rotational_springs(rho: float, count: int = 5) -> Eigenvalues:
    """Symmetric modes of a pinned span with equal rotational end springs, shape (count,).

    tan l + tanh l = -2 b/rho with rho = k_r L/EI of each end.
    """
    return 2 * _between(
        lambda x: 4 * x * math.cos(x),
        lambda x: rho * _clamped_guided(x),
        single_span("pinned-guided", count),
        single_span("clamped-guided", count),
        rho,
    )


def _sech(b: float) -> float:
    return 1 / math.cosh(b) if b < 700 else 0.0


def _clamped_free(b: float) -> float:
    return math.cos(b) + _sech(b)


def _clamped_clamped(b: float) -> float:
    return math.cos(b) - _sech(b)


def _clamped_pinned(b: float) -> float:
    return math.sin(b) - math.cos(b) * math.tanh(b)


def _clamped_guided(b: float) -> float:
    return math.sin(b) + math.cos(b) * math.tanh(b)


_SINGLE_SPAN: dict[str, tuple[Callable[[float], float], float, float]] = {
    "clamped-free": (_clamped_free, -1.0, 0.0),
    "clamped-clamped": (_clamped_clamped, 0.0, 1.0),
    "clamped-pinned": (_clamped_pinned, 0.0, 1.0),
    "clamped-guided": (_clamped_guided, -0.5, 0.0),
}
"""Equation, and the bounds of its n-th root as (n + low) pi and (n + high) pi."""


def _three_moment(theta: float) -> Callable[[float], float]:
    cosine = math.cos(theta)
    return lambda b: _clamped_pinned(b) + cosine * (math.tanh(b) - math.sin(b) * _sech(b))


def _behind_rigid(roots: Eigenvalues) -> Eigenvalues:
    """The roots behind a rigid mode, which stands just above zero: zero itself solves them all."""
    return np.concatenate([[_ALMOST_ZERO], roots[:-1]])


def _between(
    bare: Callable[[float], float],
    added: Callable[[float], float],
    low: Eigenvalues,
    high: Eigenvalues,
    ratio: float,
) -> Eigenvalues:
    """Roots of bare + added, one in each interval."""
    if not ratio >= 0 or math.isinf(ratio):
        raise ValueError(f"a ratio of {ratio:g}; expected a finite number of zero or more")
    roots = _roots(lambda b: bare(b) + added(b), low, high)
    return np.where(roots > _ALMOST_ZERO, roots, 0.0)


def _roots(equation: Callable[[float], float], low: Eigenvalues, high: Eigenvalues) -> Eigenvalues:
    return np.array([_root(equation, a, b) for a, b in zip(low, high, strict=True)])


def _root(equation: Callable[[float], float], low: float, high: float) -> float:
    """Root between two bounds; the nearer bound where rounding puts the root onto it."""
    from scipy.optimize import brentq

    at_low, at_high = equation(low), equation(high)
    if at_low * at_high >= 0:
        return float(low if abs(at_low) < abs(at_high) else high)
    rounding = 4 * float(np.finfo(float).eps)
    return float(brentq(equation, low, high, xtol=_ROOT_TOLERANCE, rtol=rounding))
