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
    offset_m: Array
    """(E, 3) from both nodes to the line of the element; a chord stands off its nodes so that it
    runs through the middle of the arc it stands for."""
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
        return replace(
            self, length_m=self.length_m * factor, offset_m=self.offset_m * factor[:, None]
        )


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
    to_local = _to_local(elements.axes[index : index + 1], elements.offset_m[index : index + 1])[0]
    to_global = elements.axes[index].T
    return to_global @ translation @ to_local, to_global @ rotation @ to_local


def axial_strain_load(elements: ElementSet, strain: Array) -> Array:
    """Nodal loads (E, 12, global) by which elements push outward when ``strain`` (E,) is held."""
    return (elements.axial_rigidity_n * strain)[:, None] * _lengthening(elements)


def axial_strain(elements: ElementSet, displacement: Array) -> Array:
    """Strain (E,) along each element under element displacements (E, 12, global)."""
    stretch: Array = np.sum(_lengthening(elements) * displacement, axis=1)
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
    to_local = _to_local(elements.axes, elements.offset_m)
    product: Array = to_local.transpose(0, 2, 1) @ local @ to_local
    return product


def _to_local(axes: Array, offset_m: Array) -> Array:
    """(E, 12, 12): motions of the element's own ends, in its axes, from those of its nodes."""
    turn = np.zeros((len(axes), 12, 12))
    lever = axes @ cross_matrix(offset_m)
    for first in (0, 6):
        turn[:, first : first + 3, first : first + 3] = axes
        turn[:, first : first + 3, first + 3 : first + 6] = -lever
        turn[:, first + 3 : first + 6, first + 3 : first + 6] = axes
    return turn


def _lengthening(elements: ElementSet) -> Array:
    """Rows (E, 12): lengthening of each element by its nodes' motions."""
    to_local = _to_local(elements.axes, elements.offset_m)
    return to_local[:, 6] - to_local[:, 0]


def cross_matrix(vector: Array) -> Array:
    """Matrices (.., 3, 3) by which a vector (.., 3) is crossed with what follows it."""
    x, y, z = np.moveaxis(np.asarray(vector, dtype=float), -1, 0)
    zero = np.zeros_like(x)
    rows = [[zero, -z, y], [z, zero, -x], [-y, x, zero]]
    return np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)


def local_axes(direction: Array) -> Array:
    """Right-handed axes (E, 3, 3) whose first row is the unit vector ``direction`` (E, 3)."""
    helper = np.eye(3)[np.argmin(np.abs(direction), axis=1)]
    second = np.cross(helper, direction)
    second /= np.linalg.norm(second, axis=1, keepdims=True)
    return np.stack([direction, second, np.cross(direction, second)], axis=1)
