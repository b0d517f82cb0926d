"""What an ensemble of rates is: samples with their inputs, and the statistics that their number supports."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc import spread
from pertcalc.collisions.recipe import Key
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.results import Coefficient, CollisionRates
from pertcalc.sampling import METHOD_GROUPS, Input, log_sd

Array = NDArray[np.float64]

CHOICE = "curve set"


@dataclass(frozen=True, slots=True)
class Sensitivity:
    """How one rate depends on one input, per temperature; arrays of shape (n,).

    `derivative` d ln|rate| / d ln(parameter) [1] and its standard error, None for methods and the choice of a set;
    `share` of the variance in first order [1] and its standard error.
    """

    name: str
    derivative: Array | None
    derivative_error: Array | None
    share: Array
    share_error: Array


@dataclass(frozen=True, slots=True)
class Ensemble:
    """Samples of every rate of one pair, with the inputs they came from.

    Parameters
    ----------
    nominal : CollisionRates
        The full answer on the undistorted curves.
    inputs : tuple of d Input
    z : ndarray, shape (m, d)
        Standard normal inputs of the finished members [1].
    chosen : ndarray of int, shape (m,)
        Which of `sets` every member has [1].
    sets : tuple of str
        Ids of the curve sets.
    samples : mapping
        Rate key to samples, shape (m, n) for n temperatures [unit of the nominal coefficient]. Keys ("fwhm", line),
        ("shift", line), ("loss", level, K), ("transfer", level), ("gain", level, K), K a string.
    asked, seed : int
        Members asked for, and the seed.
    work : mapping
        Counts of all members and of the undistorted coarse tables, the full answer apart.
    interrupted : bool
        The user stopped it; the members here were finished.
    failed : mapping
        Number of a member to why it gave nothing.
    """

    nominal: CollisionRates
    inputs: tuple[Input, ...]
    z: Array
    chosen: NDArray[np.intp]
    sets: tuple[str, ...]
    samples: Mapping[Key, Array]
    asked: int
    seed: int
    work: Mapping[str, int]
    interrupted: bool = False
    failed: Mapping[str, str] = field(default_factory=dict)

    @property
    def size(self) -> int:
        """Number of finished members."""
        return int(self.z.shape[0])

    def of(self, key: Key) -> Array:
        """Samples of one rate, shape (m, n) [unit of its coefficient]; UnknownNameError for no rate of these."""
        if key not in self.samples:
            raise UnknownNameError("rate", " ".join(map(str, key)), [" ".join(one) for one in self.samples])
        return self.samples[key]

    def mean(self, key: Key) -> Array:
        """Mean of the samples, shape (n,) [unit of its coefficient]."""
        self._at_least(1, "a mean")
        return self.of(key).mean(axis=0)

    def sd(self, key: Key) -> Array:
        """Standard deviation, shape (n,) [unit of its coefficient]; known to `sd_error`. InputError below 2 samples."""
        self._at_least(2, "a standard deviation")
        return self.of(key).std(axis=0, ddof=1)

    @property
    def sd_error(self) -> float:
        """Relative standard error of a standard deviation of m normal samples, 1/sqrt(2(m-1)) [1]: 9 % for 64."""
        return float(1 / np.sqrt(2 * max(self.size - 1, 1)))

    def quantiles(self, key: Key, levels: ArrayLike) -> Array:
        """Quantiles at k levels [1], shape (k, n) [unit of its coefficient]; InputError when m is too small."""
        return spread.quantiles(self.of(key), levels)

    def interval(self, key: Key) -> Array:
        """The 16 and 84 % quantiles, shape (2, n) [unit of its coefficient]; InputError below 32 samples."""
        return self.quantiles(key, spread.INTERVAL)

    def response(self, key: Key) -> Array:
        """ln(sample/nominal), or the relative deviation where the sign changes, shape (m, n) [1]."""
        return spread.response(self.of(key), value_of(self.nominal, key))

    def correlation(self) -> Array:
        """Correlation of the responses of all rates, in the order of `samples`, shape (n, keys, keys) [1]."""
        self._at_least(3, "correlations")
        columns = [self.response(key) for key in self.samples]
        return np.array([spread.correlations([one[:, t] for one in columns]) for t in range(columns[0].shape[1])])

    def fit(self, key: Key) -> tuple[list[Sensitivity], Array]:
        """First-order sensitivities of one rate, largest mean share first, and the share they explain, shape (n,) [1].

        Least squares of the response on the inputs of the curves, of this rate's method, and the choice of a set.
        InputError when there are too few samples for so many inputs.
        """
        used = [i for i, one in enumerate(self.inputs) if one.kind == "curve" or one.name == method_name(key)]
        choice = [self.chosen == k for k in range(1, len(self.sets))]
        x = np.column_stack([self.z[:, used], *choice]).astype(float)
        fits = [spread.linear_fit(x, y) for y in self.response(key).T]
        found = [self._sensitivity(self.inputs[i], j, fits) for j, i in enumerate(used)]
        if choice:
            share, error = (
                np.array([getattr(fit, name)[len(used) :].sum() for fit in fits]) for name in ("share", "share_error")
            )
            found.append(Sensitivity(CHOICE, None, None, share, error))
        found.sort(key=lambda one: -float(one.share.mean()))
        return found, np.array([fit.explained for fit in fits])

    def _sensitivity(self, one: Input, j: int, fits: list[spread.LinearFit]) -> Sensitivity:
        names = ("share", "share_error", "slope", "slope_error")
        share, share_error, slope, slope_error = (np.array([getattr(fit, name)[j] for fit in fits]) for name in names)
        scale = float(log_sd(one.relative))
        if one.kind != "curve" or not scale:
            return Sensitivity(one.name, None, None, share, share_error)
        return Sensitivity(one.name, slope / scale, slope_error / scale, share, share_error)

    def member(self, i: int) -> CollisionRates:
        """The rates of member i as a full answer, to be carried on (a verdict, a choice); errors are not repeated."""
        return with_values(self.nominal, {key: sample[i] for key, sample in self.samples.items()})

    def _at_least(self, m: int, what: str) -> None:
        if self.size < m:
            raise InputError(f"samples = {self.size} finished: {what} needs at least {m}")


def method_name(key: Key) -> str:
    """Name of the input that stands for the method error of a rate."""
    return f"method.{METHOD_GROUPS[key[0]]}"


def _coefficient(found: CollisionRates, key: Key) -> Coefficient:
    quantity, where = key[0], key[1]
    if quantity in ("fwhm", "shift", "transfer"):
        return getattr(found, quantity)[where]
    table = found.multipole_loss if quantity == "loss" else found.multipole_transfer
    return table[where][int(key[2])]


def value_of(found: CollisionRates, key: Key) -> Array:
    """The values of one rate by its key, shape (n,) [unit of its coefficient]."""
    values = _coefficient(found, key).values
    if values is None:
        raise InputError(f"rate {' '.join(key)} has no value with method {found.method}")
    return values


def with_values(found: CollisionRates, values: Mapping[Key, Array]) -> CollisionRates:
    """The same record with other values of its rates (by key) and without errors and exponents."""

    def changed(key: Key) -> Coefficient:
        return Coefficient(_coefficient(found, key).unit, values[key])

    return replace(
        found,
        fwhm={line: changed(("fwhm", line)) for line in found.fwhm},
        shift={line: changed(("shift", line)) for line in found.shift},
        transfer={level: changed(("transfer", level)) for level in found.transfer},
        multipole_loss={
            level: {K: changed(("loss", level, str(K))) for K in ranks} for level, ranks in found.multipole_loss.items()
        },
        multipole_transfer={
            level: {K: changed(("gain", level, str(K))) for K in ranks}
            for level, ranks in found.multipole_transfer.items()
        },
    )
