"""Channels of quantum close coupling against the 3j/6j formula of the anisotropy.

Source: Edmonds, Angular Momentum in Quantum Mechanics, eqs. 5.4.6, 7.1.6 and 7.1.7 (reduced matrix elements of coupled
systems), evaluated with pertcalc.angular (exact arithmetic) and, for a few, with sympy. The unit tensor C2 of the
orbital times C2 of the axis is P2; (1 + 5 P2)/3 projects on the p orbital along the axis.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from pertcalc.angular import six_j, three_j
from pertcalc.collisions.channels import LEVEL_OF_CHANNEL, channels

J_OF_CHANNEL = tuple((0.5, 1.5)[level] for level in LEVEL_OF_CHANNEL)
SMALL = np.arange(0.5, 15.0)
LARGE = np.array([60.5, 201.5, 550.5])


def legendre_element(j: float, N: int, j2: float, N2: int, Jt: float, six=six_j, three=three_j) -> float:
    """<(1 1/2) j, N; Jt| P2 |(1 1/2) j2, N2; Jt>, j coupled before N."""
    orbital = -3 * three(1, 2, 1, 0, 0, 0)  # <1||C2||1>
    spin = (-1) ** round(1 + 0.5 + j2 + 2) * math.sqrt((2 * j + 1) * (2 * j2 + 1)) * six(1, j, 0.5, j2, 1, 2)
    axis = (-1) ** N * math.sqrt((2 * N + 1) * (2 * N2 + 1)) * three(N, 2, N2, 0, 0, 0)
    return float((-1) ** round(j2 + N + Jt) * six(Jt, N, j, 2, j2, N2) * spin * orbital * axis)


def projector(Jt: float, partial: np.ndarray, **symbols) -> np.ndarray:
    """(1 + 5 P2)/3 over the three channels, zero where one does not exist."""
    found = np.zeros((3, 3))
    for a in range(3):
        for b in range(3):
            if partial[a] >= 0 and partial[b] >= 0:
                P2 = legendre_element(J_OF_CHANNEL[a], int(partial[a]), J_OF_CHANNEL[b], int(partial[b]), Jt, **symbols)
                found[a, b] = ((a == b) + 5 * P2) / 3
    return found


@pytest.mark.parametrize("parity", ["e", "f"])
@pytest.mark.parametrize("total", [SMALL, LARGE], ids=["small", "large"])
def test_axis_is_the_projector_of_the_anisotropy(total, parity):
    made = channels(total, parity)
    for i, Jt in enumerate(total):
        t = made.axis[:, i]
        np.testing.assert_allclose(np.outer(t, t), projector(Jt, made.partial[:, i]), atol=2e-14, err_msg=f"Jt = {Jt}")


@pytest.mark.parametrize(("Jt", "parity"), [(0.5, "e"), (0.5, "f"), (1.5, "f"), (2.5, "e"), (17.5, "f")])
def test_axis_against_sympy(Jt, parity):
    from sympy import Rational
    from sympy.physics.wigner import wigner_3j, wigner_6j

    def exact(symbol):
        return lambda *momenta: float(symbol(*(Rational(round(2 * x), 2) for x in momenta)))

    made = channels(np.array([Jt]), parity)
    wanted = projector(Jt, made.partial[:, 0], six=six_of_any(exact(wigner_6j)), three=exact(wigner_3j))
    np.testing.assert_allclose(np.outer(made.axis[:, 0], made.axis[:, 0]), wanted, atol=1e-14)


def six_of_any(symbol):
    """sympy refuses broken triangles with an error: they are zero."""

    def value(*momenta: float) -> float:
        try:
            return symbol(*momenta)
        except ValueError:
            return 0.0

    return value


@pytest.mark.parametrize("parity", ["e", "f"])
def test_axis_has_unit_length(parity):
    total = np.concatenate([SMALL, LARGE, [3000.5]])
    np.testing.assert_allclose(np.sum(channels(total, parity).axis ** 2, axis=0), 1.0, rtol=1e-13)


def test_every_channel_of_a_total_momentum_is_there_once():
    """All (j, N) that couple to Jt, split by the parity of N; at most three each."""
    for i, Jt in enumerate(SMALL):
        found = []
        for parity in ("e", "f"):
            partial = channels(SMALL, parity).partial[:, i]
            there = [(J_OF_CHANNEL[a], int(N)) for a, N in enumerate(partial) if N >= 0]
            assert len({N % 2 for _, N in there}) == 1, "one parity"
            found += there
        wanted = [(j, N) for j in (0.5, 1.5) for N in range(40) if abs(j - N) <= Jt <= j + N]
        assert sorted(found) == sorted(wanted)


@pytest.mark.parametrize(
    ("Jt", "parity", "partial"),
    [
        (0.5, "e", (0, -1, 2)),  # j = 3/2 with N = 0 makes 3/2 only
        (0.5, "f", (1, 1, -1)),
        (1.5, "e", (1, 1, 3)),
        (1.5, "f", (2, 2, 0)),
    ],
)
def test_missing_channels_of_small_momenta(Jt, parity, partial):
    made = channels(np.array([Jt]), parity)
    np.testing.assert_array_equal(made.partial[:, 0], partial)
    assert np.all(made.axis[made.partial < 0] == 0), "what does not exist does not couple"
    assert np.all(np.isfinite(made.axis))


def test_limit_of_large_momenta():
    """Jt >> 1: the mean coupling of every level is its share of the p orbital along the axis, 1/3 (trace per level)."""
    made = [channels(np.array([4000.5]), parity).axis[:, 0] for parity in ("e", "f")]
    low = sum(t[0] ** 2 for t in made)
    high = sum(t[1] ** 2 + t[2] ** 2 for t in made)
    assert low == pytest.approx(2 / 3, abs=1e-3) and high == pytest.approx(4 / 3, abs=1e-3)
