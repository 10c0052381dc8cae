"""Pipe elements: two nodes, twelve degrees of freedom, shear and rotary inertia.

Per node ux uy uz rx ry rz. Stiffness is exact for end loads on a Timoshenko beam (Przemieniecki,
*Theory of Matrix Structural Analysis*, 1968, ch. 5); mass is consistent with the same shape
functions, so frequencies converge from above. Shear coefficient: Cowper 1966, J. Appl. Mech. 33,
335, hollow circle.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_GAUSS_POINT, _GAUSS_WEIGHT = np.polynomial.legendre.leggauss(4)
_XI = (_GAUSS_POINT + 1) / 2
_XI_WEIGHT = _GAUSS_WEIGHT / 2

# Bending in the plane of local x and y turns about +z, in that of x and z about -y.
_PLANES = (
    (np.array([1, 5, 7, 11]), np.array([1.0, 1.0, 1.0, 1.0])),
    (np.array([2, 4, 8, 10]), np.array([1.0, -1.0, 1.0, -1.0])),
)
_STRETCH = np.array([0, 6])
_TWIST = np.array([3, 9])


@dataclass(frozen=True)
class ElementSet:
    """Straight round elements, one entry (E,) each."""

    length_m: Array
    """Distance between the two nodes."""
    axes: Array
    """(E, 3, 3): rows are the local x (along), y and z axes in global components."""
    axial_rigidity_n: Array
    """E A."""
    bending_rigidity_n_m2: Array
    """E I, divided by the flexibility factor in a bend."""
    torsional_rigidity_n_m2: Array
    """G J."""
    shear_rigidity_n: Array
    """kappa G A."""
    mass_kg_per_m: Array
    rotary_inertia_kg_m: Array
    """About a diameter, per length; about the axis it is twice that."""

    @property
    def shear_ratio(self) -> Array:
        """Phi = 12 EI / (kappa G A L^2), the share of shear in the element's flexibility."""
        return 12 * self.bending_rigidity_n_m2 / (self.shear_rigidity_n * self.length_m**2)

    def stretched(self, factor: Array) -> ElementSet:
        """The same elements with each length multiplied by ``factor`` (E,)."""
        return replace(self, length_m=self.length_m * factor)


def cowper_shear_coefficient(bore_ratio: float, poisson: float) -> float:
    """Kappa of a hollow circle with inner over outer diameter ``bore_ratio``."""
    m2, nu = bore_ratio**2, poisson
    thick = (1 + m2) ** 2
    return 6 * (1 + nu) * thick / ((7 + 6 * nu) * thick + (20 + 12 * nu) * m2)


def bend_flexibility(
    radius_m: Array, mean_radius_m: float, wall_m: float, pressure_pa: float, modulus_pa: float
) -> Array:
    """Flexibility factor k of bends of centre-line radius ``radius_m``; 1 where it is infinite.

    k = 1.65/h with h = T R / r^2, divided by 1 + 6 (P/E) (r/T)^(7/3) (R/r)^(1/3): ASME B31.3,
    Appendix D. Never below 1: no bend is stiffer than the straight pipe it is made of.
    """
    k = np.ones_like(radius_m)
    bent = np.isfinite(radius_m)
    ratio = radius_m[bent] / mean_radius_m
    h = wall_m * radius_m[bent] / mean_radius_m**2
    slender = (mean_radius_m / wall_m) ** (7 / 3)
    stiffening = 1 + 6 * (max(pressure_pa, 0.0) / modulus_pa) * slender * ratio ** (1 / 3)
    k[bent] = np.maximum(1.65 / h / stiffening, 1.0)
    return k


def stiffness(elements: ElementSet) -> Array:
    """Elastic stiffness (E, 12, 12) in global axes."""
    return _to_global(elements, _local_stiffness(elements))


def geometric_stiffness(elements: ElementSet, axial_force_n: Array) -> Array:
    """Stiffness (E, 12, 12) that an axial force (E,), tension positive, adds across the pipe."""
    phi, length = elements.shear_ratio, elements.length_m
    plane = np.zeros((len(length), 4, 4))
    for xi, weight in zip(_XI, _XI_WEIGHT, strict=True):
        slope = _plane_slope(length, phi, xi)
        plane += weight * (axial_force_n * length)[:, None, None] * _outer(slope, slope)
    return _to_global(elements, _spread(plane, None, None))


def mass(elements: ElementSet) -> Array:
    """Consistent mass (E, 12, 12) in global axes."""
    phi, length = elements.shear_ratio, elements.length_m
    plane = np.zeros((len(length), 4, 4))
    for xi, weight in zip(_XI, _XI_WEIGHT, strict=True):
        deflection, rotation = plane_shapes(length, phi, xi)
        moved = elements.mass_kg_per_m[:, None, None] * _outer(deflection, deflection)
        turned = elements.rotary_inertia_kg_m[:, None, None] * _outer(rotation, rotation)
        plane += weight * length[:, None, None] * (moved + turned)
    linear = np.array([[2.0, 1.0], [1.0, 2.0]]) / 6
    along = (elements.mass_kg_per_m * length)[:, None, None] * linear
    about = (2 * elements.rotary_inertia_kg_m * length)[:, None, None] * linear
    return _to_global(elements, _spread(plane, along, about))


def motion_inside(elements: ElementSet, index: int, xi: float) -> tuple[Array, Array]:
    """Translation and rotation (3, 12 each, global) at the share ``xi`` of one element's length."""
    length, phi = elements.length_m[index : index + 1], elements.shear_ratio[index : index + 1]
    deflection, turn = (row[0] for row in plane_shapes(length, phi, xi))
    translation, rotation = np.zeros((3, 12)), np.zeros((3, 12))
    translation[0, _STRETCH] = rotation[0, _TWIST] = (1 - xi, xi)
    for (dofs, sign), across, about in zip(_PLANES, (1, 2), (2, 1), strict=True):
        translation[across, dofs] = deflection * sign
        rotation[about, dofs] = turn * sign * sign[1]
    axes = elements.axes[index]
    to_local = np.zeros((12, 12))
    for block in range(0, 12, 3):
        to_local[block : block + 3, block : block + 3] = axes
    return axes.T @ translation @ to_local, axes.T @ rotation @ to_local


def axial_strain_load(elements: ElementSet, strain: Array) -> Array:
    """Nodal loads (E, 12, global) by which elements push outward when ``strain`` (E,) is held."""
    push = (elements.axial_rigidity_n * strain)[:, None] * elements.axes[:, 0]
    zero = np.zeros_like(push)
    return np.concatenate([-push, zero, push, zero], axis=1)


def axial_strain(elements: ElementSet, displacement: Array) -> Array:
    """Strain (E,) along each element under element displacements (E, 12, global)."""
    apart = displacement[:, 6:9] - displacement[:, 0:3]
    stretch: Array = np.sum(apart * elements.axes[:, 0], axis=1)
    return stretch / elements.length_m


def plane_shapes(length: Array, phi: Array, xi: float) -> tuple[Array, Array]:
    """Deflection and section rotation (E, 4 each) for end deflections and rotations w1 t1 w2 t2."""
    one = 1 + phi
    bubble = xi * (1 - xi)
    deflection = np.stack(
        [
            (1 - 3 * xi**2 + 2 * xi**3 + phi * (1 - xi)) / one,
            length * (xi * (1 - xi) ** 2 + phi / 2 * bubble) / one,
            (3 * xi**2 - 2 * xi**3 + phi * xi) / one,
            -length * (xi**2 * (1 - xi) + phi / 2 * bubble) / one,
        ],
        axis=-1,
    )
    rotation = np.stack(
        [
            -6 * bubble / (length * one),
            (1 - 4 * xi + 3 * xi**2 + phi * (1 - xi)) / one,
            6 * bubble / (length * one),
            (-2 * xi + 3 * xi**2 + phi * xi) / one,
        ],
        axis=-1,
    )
    return deflection, rotation


def _plane_slope(length: Array, phi: Array, xi: float) -> Array:
    """Slope of the deflection (E, 4), shear included."""
    one = 1 + phi
    bubble = xi * (1 - xi)
    return np.stack(
        [
            -(6 * bubble + phi) / (length * one),
            (1 - 4 * xi + 3 * xi**2 + phi / 2 * (1 - 2 * xi)) / one,
            (6 * bubble + phi) / (length * one),
            (-2 * xi + 3 * xi**2 - phi / 2 * (1 - 2 * xi)) / one,
        ],
        axis=-1,
    )


def _local_stiffness(elements: ElementSet) -> Array:
    L, phi = elements.length_m, elements.shear_ratio
    a = elements.bending_rigidity_n_m2 / (L**3 * (1 + phi))
    side = np.stack([12 * a, 6 * L * a, -12 * a, 6 * L * a], axis=-1)
    near, far = (4 + phi) * L**2 * a, (2 - phi) * L**2 * a
    plane = np.empty((len(L), 4, 4))
    plane[:, 0], plane[:, 2] = side, -side
    plane[:, 1] = np.stack([6 * L * a, near, -6 * L * a, far], axis=-1)
    plane[:, 3] = np.stack([6 * L * a, far, -6 * L * a, near], axis=-1)
    rod = np.array([[1.0, -1.0], [-1.0, 1.0]])
    along = (elements.axial_rigidity_n / L)[:, None, None] * rod
    about = (elements.torsional_rigidity_n_m2 / L)[:, None, None] * rod
    return _spread(plane, along, about)


def _spread(plane: Array, along: Array | None, about: Array | None) -> Array:
    """Put plane (E, 4, 4), rod and twist (E, 2, 2) matrices into (E, 12, 12)."""
    full = np.zeros((len(plane), 12, 12))
    for dofs, sign in _PLANES:
        full[:, dofs[:, None], dofs] = plane * np.outer(sign, sign)
    if along is not None and about is not None:
        full[:, _STRETCH[:, None], _STRETCH] = along
        full[:, _TWIST[:, None], _TWIST] = about
    return full


def _outer(a: Array, b: Array) -> Array:
    return a[:, :, None] * b[:, None, :]


def _to_global(elements: ElementSet, local: Array) -> Array:
    turn = np.zeros((len(local), 12, 12))
    for block in range(0, 12, 3):
        turn[:, block : block + 3, block : block + 3] = elements.axes
    product: Array = turn.transpose(0, 2, 1) @ local @ turn
    return product


def local_axes(direction: Array) -> Array:
    """Right-handed axes (E, 3, 3) whose first row is the unit vector ``direction`` (E, 3)."""
    helper = np.eye(3)[np.argmin(np.abs(direction), axis=1)]
    second = np.cross(helper, direction)
    second /= np.linalg.norm(second, axis=1, keepdims=True)
    return np.stack([direction, second, np.cross(direction, second)], axis=1)
