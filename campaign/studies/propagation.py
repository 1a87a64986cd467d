"""From inputs with errors to results with errors, and which input makes most of each."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.measured import Measured, Range
from campaign.model.propagated import Propagated
from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.physics.intervals import PROBABILITIES, row_quantiles

FloatArray = NDArray[np.float64]
Draws = Mapping[str, FloatArray]

# A spread below this share of the value is the rounding of the arithmetic.
_ROUNDING = 1e-12


@dataclass(frozen=True, slots=True)
class Uncertain:
    """One input: its name for people, and the values that it can have.

    A range is drawn evenly. With ``by_factor`` the errors are factors: the draws are normal in the logarithm,
    as of a number that is only known to within a factor.
    """

    name: str
    value: Measured | Range
    low: float = 0.0
    high: float = float("inf")
    by_factor: bool = False

    @property
    def nominal(self) -> float:
        if isinstance(self.value, Range):
            return 0.5 * (self.value.low + self.value.high)
        return self.value.value

    @property
    def error_known(self) -> bool:
        return isinstance(self.value, Range) or self.value.error_known

    @property
    def is_exact(self) -> bool:
        return isinstance(self.value, Measured) and self.value.minus == 0.0 and self.value.plus == 0.0


@dataclass(frozen=True, slots=True, eq=False)
class DrawnTogether:
    """Quantities that were drawn elsewhere and belong together, such as the results of one fit."""

    name: str
    draws: Mapping[str, FloatArray]
    nominal: Mapping[str, float]


class Propagator:
    """Draws of all inputs at once, and of each alone with the others as stated.

    Parameters
    ----------
    inputs : mapping of str to Uncertain
        By key, each in the unit that its key states.
    draws : int
        Number of draws (dimensionless).
    seed : int
        The draws of an input depend on its key and this alone.
    together : DrawnTogether, optional
        Results of a fit; the same number of draws.

    Notes
    -----
    Accuracy: about 1 % of an error from 20,000 draws. Source: propagation of errors by drawing, one input at
    a time for the contributions.
    """

    def __init__(
        self,
        inputs: Mapping[str, Uncertain],
        draws: int,
        seed: int,
        together: DrawnTogether | None = None,
    ) -> None:
        self.inputs = dict(inputs)
        self._together = together
        self._all = _DrawnWhenAsked(self.inputs, draws, seed)
        # One value stands for all draws: it broadcasts against those of the input that is varied.
        self._stated = {key: np.array([one.nominal]) for key, one in inputs.items()}
        if together is not None:
            self._all.update(together.draws)
            self._stated |= {key: np.array([value]) for key, value in together.nominal.items()}

    @property
    def all(self) -> Draws:
        """Draws of everything together, by key."""
        return self._all

    def __call__(self, quantity: Callable[[Draws], FloatArray], needs: Sequence[str]) -> Propagated:
        """A result; ``needs`` are the keys that it rests on, those of a fit included."""
        value = _finite(float(np.ravel(quantity(self._stated))[0]))
        unknown = tuple(
            self.inputs[key].name for key in needs if key in self.inputs and not self.inputs[key].error_known
        )
        if unknown:
            return Propagated(value, unknown_errors=unknown)
        found = summarised(quantity(self._all), value)
        if not found.sigma:
            return found
        return with_dominant(found, self._parts(quantity, needs))

    def _parts(self, quantity: Callable[[Draws], FloatArray], needs: Sequence[str]) -> dict[str, float]:
        """Squared width from each input alone, by its name for people."""
        parts: dict[str, float] = {}
        for key in needs:
            if key in self.inputs and not self.inputs[key].is_exact:
                alone = quantity(self._stated | {key: self._all[key]})
                parts[self.inputs[key].name] = float(squared_widths(alone)[0])
        together = self._together
        if together is not None and any(key in together.draws for key in needs):
            alone = quantity(self._stated | dict(together.draws))
            parts[together.name] = float(squared_widths(alone)[0])
        return parts


class _DrawnWhenAsked(dict[str, FloatArray]):
    """Draws of each input, made when a result first needs them."""

    def __init__(self, inputs: Mapping[str, Uncertain], draws: int, seed: int) -> None:
        super().__init__()
        self._inputs, self._draws, self._seed = inputs, draws, seed

    def __missing__(self, key: str) -> FloatArray:
        normals = stratified_normals([key], self._draws, self._seed)[key]
        self[key] = _drawn(self._inputs[key], normals)
        return self[key]


def summarised(draws: FloatArray, value: float | None) -> Propagated:
    """Median, standard deviation and intervals of draws; those that are NaN do not exist.

    Parameters
    ----------
    draws : ndarray, shape (draws,)
        In the unit of the result.
    value : float or None
        The result from the inputs as stated, in the same unit.

    Returns
    -------
    Propagated
        Without a dominant input.

    Notes
    -----
    Accuracy: that of the draws. Source: Hyndman & Fan 1996, American Statistician 50, 361 (quantiles).
    """
    exists = np.isfinite(draws)
    count = int(exists.sum())
    if not count:
        return Propagated(value, probability=0.0)
    ordered = np.sort(np.where(exists, draws, np.nan))[None, :]
    quantiles = row_quantiles(ordered, np.array([count]), PROBABILITIES)[0]
    sigma = float(np.std(draws[exists]))
    if sigma <= _ROUNDING * abs(quantiles[0]):
        sigma = 0.0
    median, lo68, hi68, lo95, hi95 = (float(q) for q in quantiles)
    return Propagated(value, median, sigma, lo68, hi68, lo95, hi95, count / draws.size)


def squared_widths(draws: FloatArray) -> FloatArray:
    """How much of an error one input makes: like a variance, and not ruled by a long tail.

    Parameters
    ----------
    draws : ndarray, shape (draws,) or (rows, draws)
        Draws with the error of that input alone, in the unit of the result; NaN does not exist.

    Returns
    -------
    ndarray, shape (rows,)
        Squared half-width of the central 68 %, in the square of that unit; 0 where nothing exists.

    Notes
    -----
    Accuracy: that of the draws. The 68 % interval is what is told of a result, so that its parts are measured
    alike. Of normal draws it is the variance.

    Source: Hyndman & Fan 1996, American Statistician 50, 361 (quantiles).
    """
    rows, count = _ordered(np.atleast_2d(draws))
    bounds = row_quantiles(rows, count, PROBABILITIES[1:3])
    return np.nan_to_num(0.25 * (bounds[:, 1] - bounds[:, 0]) ** 2)


def with_dominant(found: Propagated, parts: Mapping[str, float]) -> Propagated:
    """The result with the input that makes most of its error.

    Parameters
    ----------
    found : Propagated
        A result, in any unit.
    parts : mapping of str to float
        ``squared_widths`` of each input, by its name for people.

    Returns
    -------
    Propagated
        As it is where no input makes any error.

    Notes
    -----
    Accuracy: shares of the sum of the parts; what inputs do to each other is in none of them.

    Source: propagation of errors, one input at a time.
    """
    whole = sum(parts.values())
    if not found.sigma or not whole > 0.0:
        return found
    first = max(parts, key=lambda name: parts[name])
    return replace(found, dominant=first, dominant_share=parts[first] / whole)


def _ordered(rows: FloatArray) -> tuple[FloatArray, NDArray[np.int64]]:
    """Rows in order with what is not finite at the end, and how many are."""
    finite = np.isfinite(rows)
    return np.sort(np.where(finite, rows, np.nan), axis=1), finite.sum(axis=1)


def _drawn(one: Uncertain, normals: FloatArray) -> FloatArray:
    if isinstance(one.value, Range):
        from scipy.special import ndtr

        return np.asarray(one.value.low + ndtr(normals) * (one.value.high - one.value.low))
    value, minus, plus = one.value.value, one.value.minus or 0.0, one.value.plus or 0.0
    if one.by_factor and value > 0.0:
        size = np.where(normals < 0.0, -np.log1p(-min(minus / value, 0.99)), np.log1p(plus / value))
        return np.asarray(value * np.exp(size * normals))
    middle, below, above = (np.array([[x]]) for x in (value, minus, plus))
    return np.asarray(two_piece_within(middle, below, above, normals[None, :], one.low, one.high)[0])


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None
