"""From inputs with errors to results with errors, and which input makes most of each."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

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
        parts = self._parts(quantity, needs)
        whole = sum(parts.values())
        if not whole > 0.0:
            return found
        first = max(parts, key=lambda name: parts[name])
        return _with_dominant(found, first, parts[first] / whole)

    def _parts(self, quantity: Callable[[Draws], FloatArray], needs: Sequence[str]) -> dict[str, float]:
        """Variance from each input alone, by its name for people."""
        parts: dict[str, float] = {}
        for key in needs:
            if key in self.inputs and not self.inputs[key].is_exact:
                alone = quantity(self._stated | {key: self._all[key]})
                parts[self.inputs[key].name] = _variance(alone)
        together = self._together
        if together is not None and any(key in together.draws for key in needs):
            parts[together.name] = _variance(quantity(self._stated | dict(together.draws)))
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


def _variance(draws: FloatArray) -> float:
    finite = draws[np.isfinite(draws)]
    return float(np.var(finite)) if finite.size > 1 else 0.0


def _with_dominant(found: Propagated, name: str, share: float) -> Propagated:
    from dataclasses import replace

    return replace(found, dominant=name, dominant_share=share)


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None
