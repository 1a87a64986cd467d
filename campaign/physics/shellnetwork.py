"""The relations between the quantities of shells in logarithms: every way to each, and how ways compare."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations, product
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from campaign.physics.constants import KMS_PER_AU_YR
from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.physics.shellvalues import Sided, Spread, Uncertain, sided_spread, spreads_of_draws

FloatArray = NDArray[np.float64]

# Each relation says that a sum of exponents times logarithms is a constant:
# spacing = motion period, speed = 4.74 motion distance, and what follows when the motion is eliminated.
RELATIONS: tuple[tuple[dict[str, float], float], ...] = (
    ({"spacing_arcsec": 1.0, "proper_motion_mas_yr": -1.0, "period_yr": -1.0}, -float(np.log(1000.0))),
    (
        {"speed_kms": 1.0, "proper_motion_mas_yr": -1.0, "distance_pc": -1.0},
        float(np.log(KMS_PER_AU_YR / 1000.0)),
    ),
    (
        {"spacing_arcsec": 1.0, "distance_pc": 1.0, "speed_kms": -1.0, "period_yr": -1.0},
        -float(np.log(KMS_PER_AU_YR)),
    ),
)
# A tension is told of these; spacing and motion are what an image gives, and are judged through them.
_JUDGED = ("period_yr", "distance_pc", "speed_kms")


@dataclass(frozen=True, slots=True)
class ShellInput:
    """One stated value of one of the five quantities; ``label`` tells several of one quantity apart.

    Errors: None is unknown, 0 exact. With ``compare_only`` nothing is derived from it: it only stands
    against what the others say (a terminal wind speed, for dust that need not move with it).
    """

    quantity: str
    value: float
    minus: float | None = None
    plus: float | None = None
    label: str = "given"
    compare_only: bool = False

    @property
    def key(self) -> str:
        return f"{self.quantity}:{self.label}"

    @property
    def sided(self) -> Sided:
        return Sided(self.value, self.minus, self.plus)


@dataclass(frozen=True, slots=True)
class SolvedQuantity:
    """One quantity, as stated first or as it follows; ``basis`` holds the keys of the inputs it rests on."""

    quantity: str
    spread: Spread
    origin: Literal["given", "derived"]
    label: str
    basis: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Tension:
    """Two determinations of one quantity: ``sigma`` = (value - against_value)/sigma of the difference.

    ``determined_from`` and ``against`` hold the keys of the inputs; ``shared`` those that both use.
    """

    quantity: str
    determined_from: tuple[str, ...]
    against: tuple[str, ...]
    sigma: float | None
    value: float
    against_value: float
    shared: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Determination:
    """ln q = constant + coefficients . ln(inputs)."""

    coefficients: FloatArray
    constant: float
    uses: tuple[int, ...]


class ShellNetwork:
    """The stated values in logarithms, every way to each quantity, and draws of all inputs, made once."""

    def __init__(
        self, inputs: tuple[ShellInput, ...], correlation: FloatArray, draws: int, seed: int
    ) -> None:
        self.inputs = inputs
        self.correlation = correlation
        self.draws, self.seed = draws, seed
        self.logs = np.log([given.value for given in inputs]) if inputs else np.empty(0)
        self.relative = np.array([given.sided.sigma / given.value for given in inputs])
        self._drawn: FloatArray | None = None

    # --- ways to a quantity -------------------------------------------------------------------------

    def ways(self, quantity: str, left_out: frozenset[str], compared: bool = False) -> list[Determination]:
        """Every determination of ``quantity``, stated ones first, then those by each relation."""
        usable = [
            i
            for i, given in enumerate(self.inputs)
            if given.quantity not in left_out and (compared or not given.compare_only)
        ]
        found = [self._way({i: 1.0}, 0.0) for i in usable if self.inputs[i].quantity == quantity]
        return [*found, *self.derived_ways(quantity, usable)]

    def derived_ways(self, quantity: str, usable: Sequence[int]) -> Iterator[Determination]:
        for exponents, constant in RELATIONS:
            if quantity not in exponents:
                continue
            sign = exponents[quantity]
            others = [name for name in exponents if name != quantity]
            choices = [[i for i in usable if self.inputs[i].quantity == name] for name in others]
            for chosen in product(*choices):
                coefficients = {i: -exponents[name] / sign for i, name in zip(chosen, others, strict=True)}
                yield self._way(coefficients, constant / sign)

    def _way(self, coefficients: Mapping[int, float], constant: float) -> Determination:
        row = np.zeros(len(self.inputs))
        for place, coefficient in coefficients.items():
            row[place] = coefficient
        return Determination(row, constant, tuple(coefficients))

    def value(self, way: Determination) -> float:
        return float(np.exp(way.constant + way.coefficients @ self.logs))

    # --- solving ------------------------------------------------------------------------------------

    def solve(self, quantity: str) -> SolvedQuantity | None:
        for given in self.inputs:
            if given.quantity == quantity and not given.compare_only:
                return SolvedQuantity(quantity, sided_spread(given.sided), "given", given.label, (given.key,))
        combined = self._combined(quantity, frozenset())
        if combined is None:
            return None
        best = self._uncertain(combined)
        spreads = spreads_of_draws(np.array([best.value]), np.array([best.sigma]), best.draws[None, :])
        basis = tuple(self.inputs[i].key for i in combined.uses)
        return SolvedQuantity(quantity, spreads.at(0), "derived", "", basis)

    def best(self, quantity: str, left_out: frozenset[str]) -> Uncertain | None:
        for i, given in enumerate(self.inputs):
            if given.quantity == quantity and not given.compare_only and quantity not in left_out:
                return self._uncertain(self._way({i: 1.0}, 0.0))
        combined = self._combined(quantity, left_out)
        return None if combined is None else self._uncertain(combined)

    def _combined(self, quantity: str, left_out: frozenset[str]) -> Determination | None:
        """Best linear combination of the derived ways to a quantity, itself such a way."""
        usable = [
            i
            for i, given in enumerate(self.inputs)
            if not given.compare_only and given.quantity not in left_out and self._is_first(i)
        ]
        ways = list(self.derived_ways(quantity, usable))
        if not ways:
            return None
        certain = [way for way in ways if not np.isnan(self.relative[list(way.uses)]).any()]
        if not certain:
            return min(ways, key=lambda way: len(way.uses))
        rows = np.array([way.coefficients for way in certain])
        weights = _best_weights(rows @ self._log_covariance() @ rows.T)
        uses = sorted({place for way in certain for place in way.uses})
        constants = np.array([way.constant for way in certain])
        return Determination(weights @ rows, float(weights @ constants), tuple(uses))

    def _is_first(self, place: int) -> bool:
        """Whether no earlier input states the same quantity: one statement of each is derived from."""
        return not any(
            given.quantity == self.inputs[place].quantity and not given.compare_only
            for given in self.inputs[:place]
        )

    def _log_covariance(self) -> FloatArray:
        relative = np.where(np.isnan(self.relative), 0.0, self.relative)
        covariance: FloatArray = self.correlation * np.outer(relative, relative)
        return covariance

    def _uncertain(self, way: Determination) -> Uncertain:
        value = self.value(way)
        if np.isnan(self.relative[list(way.uses)]).any():
            return Uncertain(value, float("nan"), np.full(self.draws, np.nan))
        variance = float(way.coefficients @ self._log_covariance() @ way.coefficients)
        sigma = value * float(np.sqrt(max(variance, 0.0)))
        used = way.coefficients != 0.0
        drawn = np.exp(way.constant + way.coefficients[used] @ np.log(self.drawn()[used]))
        return Uncertain(value, sigma, drawn)

    def drawn(self) -> FloatArray:
        """Draws of every input, shape (inputs, draws), with correlations; NaN where an error is unknown."""
        if self._drawn is None:
            keys = [given.key for given in self.inputs]
            normals = np.array(list(stratified_normals(keys, self.draws, self.seed).values()))
            if np.any(self.correlation != np.eye(len(keys))):
                values, vectors = np.linalg.eigh(self.correlation)
                normals = vectors @ (np.sqrt(np.maximum(values, 0.0))[:, None] * (vectors.T @ normals))
            value, minus, plus = (
                np.array([[np.nan if size is None else size] for size in sizes])
                for sizes in (
                    [given.value for given in self.inputs],
                    [given.minus for given in self.inputs],
                    [given.plus for given in self.inputs],
                )
            )
            with np.errstate(invalid="ignore"):
                self._drawn = two_piece_within(
                    value, minus, plus, normals, low=float(np.finfo(np.float64).tiny)
                )
        return self._drawn

    # --- comparing ----------------------------------------------------------------------------------

    def tensions(self) -> Iterator[Tension]:
        everything = range(len(self.inputs))
        for quantity in _JUDGED:
            stated = [i for i in everything if self.inputs[i].quantity == quantity]
            usable = [i for i in everything if not self.inputs[i].compare_only and self._is_first(i)]
            derived = list(self.derived_ways(quantity, usable))
            for place in stated:
                for way in derived:
                    yield self._tension(quantity, way, self._way({place: 1.0}, 0.0))
            if not stated:
                for first, second in combinations(derived, 2):
                    yield self._tension(quantity, first, second)
        for one, other in combinations(everything, 2):
            if self.inputs[one].quantity == self.inputs[other].quantity:
                quantity = self.inputs[one].quantity
                yield self._tension(quantity, self._way({one: 1.0}, 0.0), self._way({other: 1.0}, 0.0))

    def _tension(self, quantity: str, way: Determination, against: Determination) -> Tension:
        value, other = self.value(way), self.value(against)
        shared = tuple(
            self.inputs[i].key for i in way.uses if i in against.uses and against.coefficients[i] != 0.0
        )
        sigma = self._difference_sigma(way, against, value, other)
        return Tension(
            quantity=quantity,
            determined_from=tuple(self.inputs[i].key for i in way.uses),
            against=tuple(self.inputs[i].key for i in against.uses),
            sigma=sigma,
            value=value,
            against_value=other,
            shared=shared,
        )

    def _difference_sigma(
        self, way: Determination, against: Determination, value: float, other: float
    ) -> float | None:
        stated = np.exp(self.logs)
        slope = (value * way.coefficients - other * against.coefficients) / stated
        used = slope != 0.0
        if any(not given.sided.known for given, is_used in zip(self.inputs, used, strict=True) if is_used):
            return None
        difference = value - other
        # The errors that face each other: those along which the difference shrinks.
        faces_down = slope * difference > 0.0
        sizes = np.array(
            [
                (given.minus if down else given.plus) or 0.0
                for given, down in zip(self.inputs, faces_down, strict=True)
            ]
        )
        pulls = slope * sizes
        variance = float(pulls @ self.correlation @ pulls)
        if variance <= 0.0:
            return 0.0 if abs(difference) <= 1e-12 * abs(other) else None
        return float(difference / np.sqrt(variance))


def _best_weights(covariance: FloatArray) -> FloatArray:
    """Weights that sum to 1 and make the variance least, also where the covariance is singular."""
    count = len(covariance)
    scale = float(np.trace(covariance)) / count
    if count == 1 or scale == 0.0:
        return np.full(count, 1.0 / count)
    system = np.ones((count + 1, count + 1))
    system[:count, :count] = covariance / scale
    system[count, count] = 0.0
    right = np.zeros(count + 1)
    right[count] = 1.0
    solution = np.asarray(np.linalg.lstsq(system, right, rcond=1e-12)[0], dtype=np.float64)
    return solution[:count]
