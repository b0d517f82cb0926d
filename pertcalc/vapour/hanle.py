"""Hanle curves: degree and plane of polarisation of 90-degree scattering against field, and those of the ground level.

Laboratory axes: x along the beam, z from the vapour to the observer, y = z x x normal to the scattering plane. Seen by
the observer x points right and y up; a positive angle of the plane of polarisation is counter-clockwise from y. A
positive field points along its axis (x, y or z), and a moment with g > 0 turns counter-clockwise about it. The light
is weak and broad, the ground level unpolarised. Equations and checks: notes/hanle.md.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import UPPER_LEVEL, Alkali, Isotope, Sourced
from pertcalc.vapour.hanle_fields import (
    HanleField,
    field_limits,
    ground_hanle_field,
    hanle_fields,
)
from pertcalc.vapour.level_rates import J_OF, LevelRates
from pertcalc.vapour.scattering import NATURAL, electronic_polarisability, mixture

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

# Direction of the field -> laboratory axes (x, y, z = 0, 1, 2) that serve as x', y', z' with z' along the field.
GEOMETRIES: Mapping[str, tuple[int, int, int]] = {"beam": (1, 2, 0), "sight": (0, 1, 2), "normal": (2, 0, 1)}
# Electric field of the beam: unpolarised, or linear along y, across the scattering plane.
BEAMS = ("unpolarised", "linear")
# Below this degree the plane of polarisation is rounding noise: no angle.
_NO_PLANE = 1e-10


@dataclass(frozen=True, slots=True)
class Curve:
    """Polarisation of the scattered light for one direction of the field; arrays of shape (nB,).

    ``degree`` of linear polarisation P >= 0 [1]; ``stokes_q``, ``stokes_u`` over the intensity [1]: q > 0 across the
    scattering plane, u > 0 at +45 degrees; ``angle_deg`` of the plane from y, counter-clockwise for the observer,
    -90 ... 90 [deg], nan where P is 0 and there is no plane; ``intensity`` of the light towards the observer, over that
    of isotropic scattering [1].
    """

    direction: str
    degree: Array
    stokes_q: Array
    stokes_u: Array
    angle_deg: Array
    intensity: Array


@dataclass(frozen=True, slots=True)
class HanleCurves:
    """Hanle curves of one line for the field along the beam, the line of sight, and normal to both.

    ``isotope`` label or "natural"; ``beam`` of BEAMS; ``fields_G`` [G], shape (nB,); ``G`` response of Q = 0, 1, 2
    [1], shape (3, nB); ``electronic`` W_J [1]; ``curves`` direction of GEOMETRIES -> Curve; ``weights`` of the
    isotopes [1]; ``fields`` the Hanle fields of the level; ``warnings`` for the user; ``work`` of the solver.
    """

    alkali: str
    line: str
    isotope: str
    beam: str
    fields_G: Array
    G: Complex
    electronic: float
    curves: Mapping[str, Curve]
    weights: Mapping[str, float]
    fields: tuple[HanleField, ...]
    warnings: tuple[str, ...]
    work: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class GroundHanle:
    """Hanle depolarisation of the ground-level orientation by a field across it.

    ``field`` its Hanle field; ``damped_by`` words for what damps; ``fields_G`` [G] and ``remaining`` part of the
    orientation along the pumping beam [1], shape (nB,).
    """

    isotope: str
    damped_by: str
    field: HanleField
    fields_G: Array
    remaining: Array


def excitation_tensor(beam: str) -> Array:
    """Polarisation tensor of the beam [1], shape (3, 3), trace 1, axes x y z; UnknownNameError unless in BEAMS."""
    if beam not in BEAMS:
        raise UnknownNameError("beam", str(beam), BEAMS)
    return np.diag([0.0, 0.5, 0.5] if beam == "unpolarised" else [0.0, 1.0, 0.0])


def emission_tensor(excitation: Array, direction: str, electronic: float, G: Complex) -> Array:
    """Tensor of the emitting dipoles in a field, ``rho = 1/3 + W_J (G applied to E - 1/3)``; intensity ``e rho e``.

    In axes with z' along the field the symmetric traceless part has the components ``a_0 = a_zz``,
    ``a_1 = a_xz + i a_yz``, ``a_2 = (a_xx - a_yy)/2 + i a_xy``, which a turn by phi about the field multiplies by
    e^{i Q phi}, a density-matrix component rho_KQ by e^{-i Q phi}: so ``a_Q -> W_J G_Q* a_Q``.

    Parameters
    ----------
    excitation : array, shape (3, 3)
        Real symmetric tensor of the exciting light [1], trace 1, axes x y z.
    direction : str
        Of the field, in GEOMETRIES.
    electronic : float
        W_J [1].
    G : array, shape (3, nB)
        Response of Q = 0, 1, 2 [1].

    Returns
    -------
    rho : array, shape (nB, 3, 3)
        [1], trace 1, axes x y z.

    Raises
    ------
    UnknownNameError
        Another direction.
    """
    if direction not in GEOMETRIES:
        raise UnknownNameError("direction of the field", str(direction), tuple(GEOMETRIES))
    axes = np.array(GEOMETRIES[direction])
    E = np.asarray(excitation, dtype=float)[np.ix_(axes, axes)]
    a = E - np.eye(3) * np.trace(E) / 3
    a0 = electronic * G[0].real * a[2, 2]
    a1 = electronic * G[1].conj() * (a[0, 2] + 1j * a[1, 2])
    a2 = electronic * G[2].conj() * ((a[0, 0] - a[1, 1]) / 2 + 1j * a[0, 1])
    turned = np.empty((G.shape[1], 3, 3))
    turned[:, 0, 0], turned[:, 1, 1], turned[:, 2, 2] = a2.real - a0 / 2, -a2.real - a0 / 2, a0
    turned[:, 0, 1] = turned[:, 1, 0] = a2.imag
    turned[:, 0, 2] = turned[:, 2, 0] = a1.real
    turned[:, 1, 2] = turned[:, 2, 1] = a1.imag
    back = np.argsort(axes)
    return turned[:, back][:, :, back] + np.eye(3) / 3


def stokes(rho: Array, direction: str = "") -> Curve:
    """Polarisation that the observer on the z axis sees, with ``direction`` of the field as its name.

    ``I = rho_yy + rho_xx, q = (rho_yy - rho_xx)/I, u = -2 rho_xy/I, P^2 = q^2 + u^2, tan 2 angle = u/q``.

    Parameters: ``rho`` tensors of the emitting dipoles [1], shape (nB, 3, 3). Returns a Curve.
    """
    total = rho[:, 0, 0] + rho[:, 1, 1]
    # + 0 turns a negative zero into a zero: the plane of q < 0, u = 0 is at +90 degrees, not at either end.
    q, u = (rho[:, 1, 1] - rho[:, 0, 0]) / total, -2 * rho[:, 0, 1] / total + 0.0
    degree = np.hypot(q, u)
    angle = np.where(degree > _NO_PLANE, np.degrees(np.arctan2(u, q)) / 2, np.nan)
    return Curve(direction, degree, q, u, angle, 1.5 * total)


def hanle_curves(
    alkali: Alkali,
    line: str,
    rates: LevelRates,
    fields_G: ArrayLike,
    beam: str = "unpolarised",
    isotope: str | None = None,
    collision_duration_s: float | None = None,
) -> HanleCurves:
    """P(B) and angle(B) of 90-degree scattering of "D1" or "D2", hyperfine structure and collisions included.

    Parameters
    ----------
    alkali : Alkali
    line : str
        "D1" or "D2".
    rates : LevelRates
        Of both P levels at the density of the gas [s^-1]; `level_rates.free_rates` without gas.
    fields_G : array, shape (nB,)
        Fields, negative ones against the axis [G].
    beam : str
        "unpolarised", or "linear" with the electric field across the scattering plane.
    isotope : str or None
        Label; None means the natural mixture, its intensities added.
    collision_duration_s : float or None
        For the warning about fields that act within a collision [s].

    Returns
    -------
    HanleCurves

    Raises
    ------
    InputError, UnknownNameError
        As `scattering.mixture`, `excitation_tensor`; an empty list of fields.
    """
    excitation = excitation_tensor(beam)
    fields = np.atleast_1d(np.asarray(fields_G, dtype=float))
    if not fields.size:
        raise InputError("fields: the list is empty; give at least one field [G]")
    found = mixture(alkali, line, rates, fields, isotope)
    level = UPPER_LEVEL[line]
    electronic = electronic_polarisability(J_OF[level], J_OF["S1/2"])
    G = found.G
    limits = field_limits(alkali, float(np.abs(fields).max()), rates, collision_duration_s)
    return HanleCurves(
        alkali.symbol,
        line,
        isotope or NATURAL,
        beam,
        fields,
        G,
        electronic,
        {name: stokes(emission_tensor(excitation, name, electronic, G), name) for name in GEOMETRIES},
        {one.isotope: w for one, w in zip(found.responses, found.weights, strict=True)},
        hanle_fields(alkali, level, rates, isotope),
        limits.warnings,
        found.work,
    )


def ground_hanle(isotope: Isotope, damping: Sourced, fields_G: ArrayLike, damped_by: str = "") -> GroundHanle:
    """Ground-level orientation left along the pumping beam in a field across it, ``1 / (1 + (B/B_H)^2)``.

    Parameters
    ----------
    isotope : Isotope
    damping : Sourced
        Damping rate of the orientation [s^-1]; > 0. It sums what damps: pumping, walls, gas, spin exchange.
    fields_G : array, shape (nB,)
        [G].
    damped_by : str
        Words for what damps, for the figure.

    Returns
    -------
    GroundHanle
        ``remaining`` [1] of one F that precesses as a whole with g_F = g_J/(2I+1).

    Raises
    ------
    InputError
        The damping is not positive or not in s^-1, or a field is not finite.
    """
    if damping.unit != "s^-1":
        raise InputError(f"damping is in {damping.unit!r}; it must be in 's^-1'")
    fields = np.atleast_1d(np.asarray(fields_G, dtype=float))
    if not np.isfinite(fields).all():
        raise InputError("fields must be finite numbers [G]; give other values")
    field = ground_hanle_field(isotope, damping.value)
    return GroundHanle(isotope.label, damped_by, field, fields, 1 / (1 + (fields / field.field_G) ** 2))


def field_grid(excited_G: float, ground_G: float | None = None, points: int = 240) -> Array:
    """Fields for a figure on a logarithmic axis [G]: close around the excited level, thin down to the ground level.

    ``points`` from 1/30 of the Hanle field ``excited_G`` [G] to 100 times, where level crossings are as narrow as it;
    with ``ground_G`` [G] a sixth as many more from 1/30 of that. Raises InputError unless all are finite and > 0.
    """
    given = [excited_G] if ground_G is None else [excited_G, ground_G]
    if not all(np.isfinite(B) and B > 0 for B in given) or points < 2:
        raise InputError(f"Hanle fields = {given} G must be finite and > 0, points = {points} at least 2; give others")
    dense = np.geomspace(excited_G / 30, 100 * excited_G, points)
    if ground_G is None or ground_G >= excited_G:
        return dense
    return np.concatenate([np.geomspace(ground_G / 30, dense[0], points // 6 + 1, endpoint=False), dense])
